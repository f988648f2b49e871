import tomllib

from hypothesis import assume, given
from hypothesis import strategies as st

from composer.rig.lines import Place, Spot, find_places

DOCUMENT = """\
# a comment with [brackets] and = signs
[rig]
name = "a # \\" ] name"   # said

fiber_type.cord.kind = 'x'
[valve_type."odd name"]
C = 1
[[fiber]]
at_m = [0.0,   # first
  -1e3,
  3]
[[fiber]]
x = { y = 1, "z.w" = [true, {q = 2}] }
  [fiber.sub]
  text = \"\"\"
one [two] "three" = 4
\"\"\"\"
  when = 1979-05-27 07:32:00
"""


def spot(line, column, width):
    return Spot(line, column, width)


def test_every_kind_of_key_and_value_is_found_where_it_stands():
    places = find_places(DOCUMENT)
    assert places["rig",] == Place(spot(2, 1, 5), spot(2, 1, 5))
    assert places["rig", "name"] == Place(spot(3, 1, 4), spot(3, 8, 15))
    assert places["rig", "fiber_type", "cord", "kind"] == Place(spot(5, 1, 20), spot(5, 24, 3))
    assert places["rig", "fiber_type"] == Place(spot(5, 1, 20), spot(5, 1, 20))
    assert places["valve_type", "odd name"].key == spot(6, 1, 23)
    assert places["fiber", 0].key == spot(8, 1, 9)
    assert places["fiber", 0, "at_m"] == Place(spot(9, 1, 4), spot(9, 8, 15))
    assert places["fiber", 0, "at_m", 1].value == spot(10, 3, 4)
    assert places["fiber", 0, "at_m", 2].value == spot(11, 3, 1)
    assert places["fiber", 1].key == spot(12, 1, 9)
    assert places["fiber", 1, "x", "y"] == Place(spot(13, 7, 1), spot(13, 11, 1))
    assert places["fiber", 1, "x", "z.w", 1, "q"] == Place(spot(13, 30, 1), spot(13, 34, 1))
    assert places["fiber", 1, "sub"].key == spot(14, 3, 11)
    assert places["fiber", 1, "sub", "text"].value == spot(15, 10, 3)
    assert places["fiber", 1, "sub", "when"].value == spot(18, 10, 19)


def test_a_header_of_its_own_is_the_place_of_a_table_even_after_that_of_an_inner_one():
    places = find_places("[a.b]\n[a]\n")
    assert places["a",].key == spot(2, 1, 3)
    assert places["a", "b"].key == spot(1, 1, 5)


KEYS = st.sampled_from(["a", "b", "c-d", "9", '"x y"', "'q.r'", '"\\u00e9\\""', "_"])
BLANKS = st.sampled_from(["", " ", "\t  "])
GAPS = st.sampled_from(["", " ", "\n", "\n  # ] } \" = '''\n "])
TEXTS = st.text(st.sampled_from("ab#=[]{}',.\t é"), max_size=6)
SCALARS = st.one_of(
    st.integers().map(str),
    st.floats(allow_nan=False, allow_infinity=False).map(repr),
    st.sampled_from(
        ["true", "false", "0xfe", "1_000", "1979-05-27T07:32:00Z", "1979-05-27 07:32:00.5", "07:32:00", "'lit # eral'"]
    ),
    TEXTS.map(lambda text: '"' + text.replace("\t", "\\t") + '\\\\ \\""'),
    TEXTS.map(lambda text: '"""\n' + text + '\n"" \\"""" x"""""'.replace('"""" x', '" x')),
    TEXTS.map(lambda text: "'''" + text.replace("'", "") + "\n'' x'''"),
)


def arrays(values):
    def write(items, blank, gap, trailing):
        return "[" + gap + f"{gap},{blank}".join(items) + (gap + "," if trailing and items else "") + gap + "]"

    return st.builds(write, st.lists(values, max_size=4), BLANKS, GAPS, st.booleans())


def inlines(values):
    pairs = st.lists(st.tuples(dotted(2), values), max_size=3, unique_by=lambda pair: pair[0])
    return st.builds(lambda pairs, b: "{" + b + f"{b},{b}".join(f"{k}{b}={b}{v}" for k, v in pairs) + b + "}", pairs, BLANKS)


def dotted(most):
    return st.builds(lambda parts, blank: f"{blank}.{blank}".join(parts), st.lists(KEYS, min_size=1, max_size=most), BLANKS)


VALUES = st.recursive(SCALARS, lambda inner: arrays(inner) | inlines(inner), max_leaves=8)
PAIRS = st.builds(lambda k, b, v, c: f"{b}{k}{b}={b}{v}{b}{c}", dotted(3), BLANKS, VALUES, st.sampled_from(["", "# x = [1"]))
HEADERS = st.builds(
    lambda key, blank, row: blank + ("[[" if row else "[") + blank + key + blank + ("]]" if row else "]"),
    dotted(3),
    BLANKS,
    st.booleans(),
)
TEXT = st.lists(st.one_of(PAIRS, PAIRS, HEADERS, st.sampled_from(["", "# [c]"])), max_size=12).map("\n".join)


def flatten(value, path=()):
    """Every path of a document, tables and arrays included."""
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, inner in items:
        yield (*path, key), inner
        yield from flatten(inner, (*path, key))


@given(TEXT)
def test_every_path_that_the_reader_of_values_finds_has_its_place_and_no_other(text):
    try:
        values = tomllib.loads(text)
    except tomllib.TOMLDecodeError:
        assume(False)
    # An array of tables has headers but no place as a whole beside the first of them.
    assert set(find_places(text)) == {path for path, _ in flatten(values)}


@given(TEXT)
def test_the_text_at_a_value_s_place_is_that_value_and_the_key_stands_before_it(text):
    try:
        values = tomllib.loads(text)
    except tomllib.TOMLDecodeError:
        assume(False)
    places = find_places(text)
    lines = text.split("\n")
    for path, value in flatten(values):
        place = places[path]
        if isinstance(value, dict | list):
            continue
        begin = lines[place.value.line - 1][place.value.column - 1 :]
        rest = "\n".join([begin, *lines[place.value.line :]])
        written = begin[: place.value.width]
        if not begin.startswith(('"""', "'''")):
            assert tomllib.loads("k = " + written)["k"] == value
        else:
            end = next(n for n in range(6, len(rest) + 1) if parses_to(rest[:n], value))
            assert rest[:end].split("\n")[0] == written
        if isinstance(path[-1], str):
            key = lines[place.key.line - 1][place.key.column - 1 :][: place.key.width]
            assert list(flatten(tomllib.loads(f"{key} = 1")))[-1][0][-1] == path[-1]


def parses_to(text, value):
    try:
        return tomllib.loads("k = " + text)["k"] == value
    except tomllib.TOMLDecodeError:
        return False
