"""Random scores as text: canons, cuts, layers, repeats, both ways, over changes and a ramp of tempo."""

from hypothesis import strategies as st

TEMPO = "tempo 60\ntempo 90 at 3:1\ntempo 90 to 45 from 4:1 to 6:1\n"

AMOUNTS = st.sampled_from(["rest", "full", "0.4", "0.75", "12%", "20mm", "hold", "1/3"])
WAYS = st.sampled_from(["", "smooth", "linear", "swell", "settle", "sudden", "step", "curve 0.2 0.7 12% 0.9"])
QUIVERS = st.sampled_from([""] * 5 + [" quiver 2Hz by 0.05", " quiver 5.5Hz by 3mm", " quiver 0.3Hz by 1%"])


@st.composite
def phrases(draw, name: str, unit: str) -> tuple[str, bool]:
    """A phrase, and whether it may run backwards."""
    gaps = draw(st.lists(st.integers(1, 8), min_size=1, max_size=5))
    opens = draw(st.booleans())
    rows, at = [], 0
    if opens:
        rows.append(f"  0 {draw(st.sampled_from(['rest', 'full', '0.4']))}")
    for gap in gaps:
        at += gap
        over = draw(st.sampled_from([0, 0, 1, 2, 3]))
        way = draw(WAYS)
        tail = f" over {over}/4{unit}" if over and over < gap and way != "step" else ""
        tail += draw(QUIVERS)
        rows.append(f"  {at}/4{unit} {draw(AMOUNTS)} {way}{tail}")
    longer = draw(st.sampled_from(["", f" {at + 3}/4{unit}"]))
    return f"phrase {name}{longer}\n" + "\n".join(rows) + "\n", opens and not unit


@st.composite
def scores(draw) -> str:
    made = {name: draw(phrases(name, unit)) for name, unit in (("p", ""), ("q", ""), ("t", "s"))}
    text = TEMPO + "".join(phrase for phrase, _ in made.values())
    text += "section a at 1:1" + draw(st.sampled_from(["", " times 2 every 9"])) + "\n"
    for _ in range(draw(st.integers(1, 5))):
        name = draw(st.sampled_from(sorted(made)))
        fibers = draw(st.sampled_from(["r.1", "r.2", "r.1-3", "r.*", "r.2, r.4"]))
        options = [f"after {draw(st.integers(0, 60))}/7"]
        options += draw(
            st.lists(
                st.sampled_from(
                    ["add", "canon 1/3", "times 3 every 5/4", "scale 1/2", "stretch 3/2", "stretch 1/2", "mirror", "times 2"]
                ),
                unique_by=lambda option: option.split()[0],
                max_size=4,
            )
        )
        if any(option.startswith("canon") for option in options) and draw(st.booleans()):
            options[[option[:5] for option in options].index("canon")] += draw(
                st.sampled_from([" from end", " from middle", " from edges"])
            )
        if made[name][1] and draw(st.booleans()):
            options.append("retrograde")
        text += f"  {fibers} {name} {' '.join(options)}\n"
    return text
