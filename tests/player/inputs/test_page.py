from importlib.resources import files

import pytest

from player.inputs import learn, map_file, midi, midi_clock, midi_file, mtc, osc, osc_packets, osc_port, schema
from player.inputs.page import map_tables, midi_tables, osc_tables

MANUAL = files("player") / "manual"
PAGES = {"maps": map_tables(), "midi": midi_tables(), "osc": osc_tables()}


def page(name):
    return (MANUAL / f"{name}.md").read_text(encoding="utf-8")


@pytest.mark.parametrize(("name", "heading"), [(name, heading) for name, tables in PAGES.items() for heading in tables])
def test_every_table_of_the_code_is_in_its_page(name, heading):
    assert PAGES[name][heading] in page(name), f"put this table into {name}.md:\n{PAGES[name][heading]}"


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("maps", f"at most {schema.MOST_BINDS} binds"),
        ("maps", f"up to {map_file.MOST_COUNTS} counts"),
        ("maps", f"after {learn.MOVES} different values"),
        ("midi", f"{midi.SENSING_S * 1000:.0f} ms"),
        ("midi", f"within {midi.PAIR_S * 1000:.0f} ms"),
        ("midi", f"for {midi_clock.COAST_S:.0f} s"),
        ("midi", f"for {mtc.COAST_S:g} s"),
        ("osc", f"{osc_packets.LARGEST} bytes"),
        ("osc", f"{osc_packets.DEEPEST} deep"),
        ("osc", f"{osc.PACKETS_A_S:.0f} packets a second, {osc.BURST:.0f} at once"),
        ("osc", f"{osc.FARTHEST_S:.0f} s ahead"),
        ("osc", f"at most {osc.MOST_WAITING}"),
        ("osc", f"{osc_port.HOST}:{osc_port.PORT}"),
        ("tempo", f"{midi_file.MOST_BYTES >> 20} MiB"),
        ("tempo", f"{midi_file.DIVISION} ticks"),
    ],
)
def test_the_numbers_of_a_page_are_those_of_the_code(name, words):
    assert words in " ".join(page(name).split())


def test_the_examples_of_the_page_on_maps_are_maps(map_of):
    for text in page("maps").split("```toml\n")[1:]:
        example = text.split("```")[0].replace("[source]\nsilence_s = 0\n", "").replace('"reeds"', '"r.*"')
        assert map_of(example).binds
