"""What the manual's page on porting says, tried."""

import re
import subprocess
from pathlib import Path

import pytest

import player

PAGE = (Path(player.__file__).parent / "manual" / "porting.md").read_text(encoding="utf-8")
SOURCES = Path(player.__file__).parent / "wire" / "device_c"
STUBS = """
#include <stddef.h>
#include <stdint.h>
void pwm_write(uint16_t channel, uint16_t value);
void uart_put_all_or_nothing(const uint8_t *bytes, uint16_t count);
size_t uart_take(uint8_t *bytes, size_t room);
void valves_off(void);
uint32_t timer_us(void);
void hardware_watchdog_kick(void);
"""
ASKS = """
#include "device.h"
#include <stdio.h>
int main(void)
{
    printf("%zu %zu %d %d\\n", sizeof(struct dc_device), sizeof(struct dc_set), (int)DC_IN_LIMIT, (int)DC_OUT_LIMIT);
    return 0;
}
"""


def test_its_example_compiles_without_a_warning_but_for_contexts_that_it_does_not_use(compiler, tmp_path):
    example = re.search(r"```c\n(.*?)```", PAGE, re.DOTALL)[1]
    (tmp_path / "example.c").write_text(STUBS + example)
    call = [compiler, "-std=c99", "-pedantic", "-Wall", "-Wextra", "-Wno-unused-parameter", "-Werror", f"-I{SOURCES}", "-c"]
    done = subprocess.run([*call, "example.c"], cwd=tmp_path, capture_output=True, text=True, timeout=60)
    assert (done.returncode, done.stderr) == (0, "")


@pytest.mark.parametrize("channels", [1, 16, 48, 300, 2000])
def test_the_memory_that_it_names_is_what_a_device_has(compiler, tmp_path, channels):
    (tmp_path / "ask.c").write_text(ASKS)
    call = [compiler, f"-DDC_CHANNELS={channels}", f"-I{SOURCES}", "ask.c", "-o", "ask"]
    subprocess.run(call, cwd=tmp_path, check=True, timeout=60)
    told = subprocess.run([tmp_path / "ask"], capture_output=True, check=True, timeout=60).stdout
    device, queued, coming, going = map(int, told.split())
    assert queued == -(-(20 + 2 * channels) // 8) * 8
    assert coming == 2061
    assert f"| {coming}, whatever the sizes |" in PAGE
    sensed = min(channels, 1020)
    assert going == max(272, 14 + 2 * sensed + (12 + 2 * sensed) // 254)
    rest = device - 64 * queued - coming - going - 64 * 2 - 4 * channels
    assert 60 <= rest <= 140


def test_it_names_every_member_of_the_board():
    members = re.search(r"struct dc_board \{(.*?)\n\};", (SOURCES / "device.h").read_text(), re.DOTALL)[1]
    members = re.sub(r"/\*.*?\*/", "", members, flags=re.DOTALL)
    names = re.findall(r"\(\*(\w+)\)\(|\b(\w+);", members)
    assert len(names) == 13
    for function, value in names:
        assert f"`{function or value}`" in PAGE
