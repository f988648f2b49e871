import json
import tomllib
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from composer.rig.canonical import canonical, fingerprint
from composer.rig.reading import read_rig

SMALL = Path(__file__).with_name("small.rig.toml").read_text()
VALUES = tomllib.loads(SMALL)


def spelt(value, draw):
    """A value as TOML, numbers in any of their spellings."""
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return draw(st.sampled_from([json.dumps(value), f"'{value}'", f'"""{value}"""']))
    if isinstance(value, list):
        gap = draw(st.sampled_from(["", " ", "\n  # comment\n"]))
        return "[" + ",".join(gap + spelt(item, draw) for item in value) + gap + "]"
    forms = [repr(value), f"+{value!r}", f"{float(value)!r}", f"{value:.12e}", f"{float(value):.9f}0"]
    return draw(st.sampled_from(forms))


@st.composite
def written_otherwise(draw):
    """The small rig with its tables and keys in another order, numbers spelt otherwise, comments here and there."""

    def table(header, values):
        keys = draw(st.permutations(list(values.items())))
        comments = draw(st.lists(st.sampled_from(["", "# said", "   # [x]"]), min_size=len(keys), max_size=len(keys)))
        lines = [f"{key} = {spelt(value, draw)} {comment}" for (key, value), comment in zip(keys, comments, strict=True)]
        return "\n".join([header, *lines, ""])

    tables = []
    for name, value in VALUES.items():
        if name in ("fiber", "fibers"):
            continue
        inner = value.items() if name in ("fiber_type", "valve_type", "driver") else ()
        tables += [table(f"[{name}.{key}]", keys) for key, keys in inner] or [table(f"[{name}]", value)]
    row, single = VALUES["fibers"][0], VALUES["fiber"][0]
    fibers = [table("[[fibers]]", row)]
    if draw(st.booleans()):
        shared = {key: value for key, value in row.items() if key not in ("name", "count", "step_m", "mirrored")}
        mirror = [{"mirror": "reed.4"}, {"mirror": "reed.3"}, {}, {}]
        fibers = [
            table("[[fiber]]", {**shared, "name": f"reed.{n + 1}", "channel": n, "at_m": [n / 10, 0, 0], **mirror[n]})
            for n in range(4)
        ]
    fibers.append(table("[[fiber]]", single))
    order = draw(st.permutations([*tables, "\n".join(fibers)]))
    return "\n".join(order)


@given(written_otherwise())
def test_comments_order_spelling_and_rows_do_not_change_the_fingerprint(text):
    assert read_rig(text, "other").fingerprint == read_rig(SMALL, "f").fingerprint


def test_a_default_written_out_changes_nothing():
    text = SMALL.replace("channel = 4", 'channel = 4\nvalve = "mini"\ndriver = "left"\nload_N = 0\ntoward = [0, 0, -2]')
    assert read_rig(text, "f").fingerprint == read_rig(SMALL, "f").fingerprint


CHANGES = [
    ('name = "Bench"', 'name = "Bank"'),
    ('name = "Bench"', 'name = "Bench"\nambient_kPa = 100'),
    ('name = "Bench"', 'name = "Bench"\ntemperature_C = 21'),
    ("pressure_kPa = 400\nmin", "pressure_kPa = 401\nmin"),
    ("min_pressure_kPa = 450", "min_pressure_kPa = 451"),
    ("receiver_L = 10", 'receiver_L = 10\nmedium = "water"'),
    ("receiver_L = 10", "receiver_L = 10.000001"),
    ("compressor_L_min = 40", "compressor_L_min = 40\npolytropic = 1.3"),
    ("stroke = 0.3", "stroke = 0.31"),
    ("air_mL = 3", "air_mL = 3\naccel_per_s2 = 20"),
    ("C_dm3_s_bar = 0.005", "C_dm3_s_bar = 0.005\nduty = 0.5"),
    ("C_dm3_s_bar = 0.005", "C_dm3_s_bar = 0.005\nenergised_while_holding = true"),
    ("channels = 8", "channels = 9"),
    ("count = 4", "count = 3"),
    ("step_m = [0.1, 0, 0]", "step_m = [0.1, 0, 0.001]"),
    ("mirrored = true", "mirrored = false"),
    ("channel = 4", "channel = 5"),
    ("channel = 4", "channel = 4\nbundle = 2"),
    ("channel = 4", "channel = 4\nmax_hold_s = 2"),
    ("channel = 4", "channel = 4\ntoward = [0, 1, -1]"),
    ("channel = 4", "channel = 4\ntube_length_mm = 1001"),
    ('["reed.*"]', '["reed.1-3"]'),
    ('reeds = ["', 'rods = ["'),
]


@pytest.mark.parametrize("change", CHANGES, ids=[now.split("\n")[-1] for _, now in CHANGES])
def test_a_change_that_matters_changes_the_fingerprint(change):
    assert SMALL.count(change[0]) == 1
    assert read_rig(SMALL.replace(*change), "f").fingerprint != read_rig(SMALL, "f").fingerprint


def test_the_order_of_fibers_matters_because_canons_run_along_it():
    rig = read_rig(SMALL, "f")
    assert fingerprint(replace(rig, fibers=rig.fibers[::-1])) != rig.fingerprint


def test_the_canonical_form_is_sorted_ascii_with_every_number_a_float():
    rig = replace(read_rig(SMALL, "f"), name="föhn")
    form = canonical(rig)
    values = json.loads(form)
    assert form.isascii() and " " not in form
    assert form == json.dumps(values, sort_keys=True, separators=(",", ":"))
    assert values["fiber"][3]["channel"] == 3.0 and '"channel":3.0' in form
    assert list(values) == ["driver", "fiber", "fiber_type", "group", "rig", "supply", "valve_type"]
