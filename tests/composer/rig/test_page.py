from importlib.resources import files

import pytest

from composer.fiber.kinds import KINDS
from composer.rig import schema
from composer.rig.page import page_tables
from composer.rig.reading import read_rig

PAGE = (files("composer") / "manual" / "rig.md").read_text(encoding="utf-8")


@pytest.mark.parametrize(("heading", "table"), page_tables().items(), ids=list(page_tables()))
def test_the_manual_has_every_key_with_its_range_and_default(heading, table):
    assert table in PAGE, f"put this table of {heading} into the page:\n{table}"


def test_the_manual_has_a_heading_for_every_kind_of_fiber():
    for kind in KINDS:
        assert f'### `kind = "{kind}"`' in PAGE


def test_the_manual_states_the_bounds():
    for bound in (
        f"at most {schema.MOST_FIBERS} fibers",
        f"a driver at most {schema.MOST_CHANNELS} channels",
        f"at most {schema.MOST_BYTES >> 20} MiB and {schema.MOST_LINES:,} lines".replace(",", " "),
        f"at most {schema.MOST_LINE} characters",
        f"at most {schema.MOST_DOTS} parts",
        f"at most {schema.LONGEST_NAME} characters",
        f"up to {schema.MOST_FAULTS} of them",
    ):
        assert bound in " ".join(PAGE.split()), bound


def test_the_smallest_rig_of_the_manual_works():
    text = PAGE.split("```toml\n")[1].split("```")[0]
    assert [fiber.name for fiber in read_rig(text, "f").fibers] == ["reed.1", "reed.2"]
