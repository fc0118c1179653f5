"""The schematic: the drawn wires form the network, every leg is there once, nothing covers anything."""

import itertools
from dataclasses import dataclass, replace

import numpy as np
import pytest
from makers import brief, random_tree
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.transforms import Bbox

from tcplan.figures.files import network_figure
from tcplan.figures.network import (
    CUT_NOTE,
    IDS_NOTE,
    LEAST_SCALE,
    PAGE,
    draw_network,
    sketch_of,
)
from tcplan.figures.style import TEXT_SIZE, figure_style
from tcplan.network import Leg, leg_names, legs, mapped, value
from tcplan.network_reading import MAX_DEPTH, MAX_LEGS, parse_network
from tcplan.units import format_ohms
from tcplan.workflow.planning import make_plan

LONG = "a_film_with_a_name_of_forty_characters_{}"
BRIDGE = "(gold_paste 5k1 || green_paste 6k2) + gold_paste 9k1"  # examples/bridge_check
TWELVE = (
    "red 1k + ((blue 2k || (amber 3k + slate 4k)) + red 5k) + "
    "((well 6k + (red 7k || blue 8k || amber 9k)) || (slate 10k + well 11k) || red 12k)"
)


def ladder(rungs: int) -> str:
    text = "end 1k"
    for rung in range(rungs):
        text = f"side 2k || ({text})" if rung % 2 else f"line_film 12.34 kohm + ({text})"
    return text


def many(count: int, sign: str) -> str:
    return sign.join(f"m{n} {n + 1}k" for n in range(count))


CASES = {
    "single": "red 12.34 kohm",
    "series": "red 12 kohm + blue 6009 ohm",
    "parallel": "red 12 kohm || blue 6009 ohm || amber 281.9 kohm",
    "even rungs": many(4, " || "),
    "parallel first": "(red 12k || blue 6k) + amber 1k2",
    "parallel twice": "(red 12k || blue 6k) + (red 1k || blue 2k || amber 3k)",
    "nested": "((red 12k + blue 6k) || amber 1k2) || slate 1234 kohm",
    "uneven rungs": "red 1k || (red 2k + (red 3k || red 4k || red 5k || red 6k)) || red 7k",
    "bridge": BRIDGE,
    "twelve": TWELVE,
    "long names": f"{LONG.format(1)} 12k + {LONG.format(2)} 6k",
    "cut names": " + ".join(f"{LONG.format(n)} {n + 1}k" for n in range(6)),
    "small text": many(11, " + "),
    "most in series": many(MAX_LEGS, " + "),
    "most in parallel": many(MAX_LEGS, " || "),
    "deepest": ladder(MAX_DEPTH),
}


@pytest.fixture(scope="module")
def plan():
    films = "".join(
        f'[material.{name}]\nsource = "invented"\nreference = "25 degC"\nvalid = ["-60 degC", "160 degC"]\n'
        f'tc1 = "{tc1} ppm/K"\n'
        for name, tc1 in (("red", 100.0), ("blue", -90.0))
    )
    head = 'schema = 1\ntitle = "t"\n[resistor]\nvalue = "18 kohm"\n[temperature]\n'
    return make_plan(brief(f'{head}low = "0 degC"\nhigh = "70 degC"\n[goal]\ndrift = "1 %"\n{films}'))


@dataclass
class Drawn:
    """A drawing on its page, and what is read from its artists [data of the axes]."""

    network: object
    figure: Figure
    ax: object
    artists: object

    def __post_init__(self) -> None:
        self.renderer = FigureCanvasAgg(self.figure).get_renderer()
        self.figure.draw(self.renderer)
        self.boxes = {name: box.get_bbox() for name, box in self.artists.boxes.items()}
        self.wires = [tuple(map(tuple, wire.tolist())) for wire in self.artists.wires.get_segments()]
        self.dots = set(zip(*self.artists.dots.get_data(), strict=True))
        self.terminals = list(zip(*self.artists.terminals.get_data(), strict=True))

    def words(self):
        """Yield the text and the rectangle of every line of words, as rendered."""
        for lines in self.artists.words.values():
            for line in lines:
                box = line.get_window_extent(self.renderer)
                yield line.get_text(), box.transformed(self.ax.transData.inverted())


def drawn(plan, network) -> Drawn:
    option = replace(plan.best, network=network)
    with figure_style():
        figure = network_figure(replace(plan, options=(option,)))
        (ax,) = figure.axes
        empty = figure.add_axes(ax.get_position(original=True))
        ax.remove()
        return Drawn(network, figure, empty, draw_network(empty, option))


@pytest.fixture(scope="module", params=CASES)
def case(request, plan) -> Drawn:
    return drawn(plan, parse_network(CASES[request.param]))


# --- the wires form the network ---------------------------------------------------------------


def touches(point, wire) -> bool:
    """Whether a point lies on a wire that is level or upright, up to rounding."""
    (x0, y0), (x1, y1) = wire
    x, y = point
    near = 1e-9
    return min(x0, x1) - near <= x <= max(x0, x1) + near and min(y0, y1) - near <= y <= max(y0, y1) + near


def nodes(drawing: Drawn):
    """Return for every wire the node it belongs to: wires that share a point are one node."""
    node = list(range(len(drawing.wires)))
    for i, j in itertools.combinations(range(len(node)), 2):
        one, other = drawing.wires[i], drawing.wires[j]
        if any(touches(p, other) for p in one) or any(touches(p, one) for p in other):
            node = [node[i] if n == node[j] else n for n in node]
    return node


def node_at(drawing: Drawn, node, point) -> int:
    found = {n for n, wire in zip(node, drawing.wires, strict=True) if touches(point, wire)}
    assert len(found) == 1, point
    return found.pop()


def ends(drawing: Drawn):
    """Yield the two nodes of every leg, in order: what touches the middle of its left and right side."""
    node = nodes(drawing)
    for box in drawing.boxes.values():
        middle = 0.5 * (box.y0 + box.y1)
        yield node_at(drawing, node, (box.x0, middle)), node_at(drawing, node, (box.x1, middle))


def terminal_nodes(drawing: Drawn):
    """Return the nodes of the terminals; a wire ends at the edge of their circles."""
    node, radius = nodes(drawing), 0.5 * drawing.artists.terminals.get_markersize()
    unit = 1.0 / (drawing.ax.transData.transform((1, 0)) - drawing.ax.transData.transform((0, 0)))[0]
    reach = radius * drawing.figure.dpi / 72.0 * unit
    (left, y), (right, _) = drawing.terminals
    return node_at(drawing, node, (left + reach, y)), node_at(drawing, node, (right - reach, y))


def measured(drawing: Drawn, ohms) -> float:
    """Return the resistance between the terminals by Kirchhoff's laws: one volt, node by node."""
    pairs = list(ends(drawing))
    start, end = terminal_nodes(drawing)
    index = {n: k for k, n in enumerate({n for pair in pairs for n in pair} | {start, end})}
    matrix = np.zeros((len(index), len(index)))
    for (a, b), each in zip(pairs, ohms, strict=True):
        i, j = index[a], index[b]
        matrix[[i, j], [i, j]] += 1.0 / each
        matrix[[i, j], [j, i]] -= 1.0 / each
    keep = [k for n, k in index.items() if n != end]
    current = np.zeros(len(index))
    current[index[start]] = 1.0
    volts = np.linalg.solve(matrix[np.ix_(keep, keep)], current[keep])
    return float(volts[keep.index(index[start])])


def with_values(network, rng):
    """Return the same tree with other values, in the order of its legs."""
    return mapped(network, lambda leg: Leg(material=leg.material, ohms=float(10 ** rng.uniform(2, 4))))


def assert_is_the_network(drawing: Drawn) -> None:
    # Kirchhoff's laws on what was drawn. Three sets of values: only the same joints give the same
    # resistance for each.
    rng = np.random.default_rng(1)
    for _ in range(3):
        network = with_values(drawing.network, rng)
        assert measured(drawing, [leg.ohms for leg in legs(network)]) == pytest.approx(
            value(network), rel=1e-9
        )


def test_the_drawn_wires_form_the_network(case: Drawn) -> None:
    assert_is_the_network(case)


@pytest.mark.parametrize("seed", range(6))
def test_the_drawn_wires_of_random_trees_form_them(plan, seed: int) -> None:
    rng = np.random.default_rng(seed)
    drawing = drawn(plan, random_tree(rng, ("red", "blue", "amber"), int(rng.integers(5, 24))))
    assert_is_the_network(drawing)
    assert_nothing_is_covered(drawing)


def test_wires_run_level_or_upright_and_cross_only_at_dots(case: Drawn) -> None:
    assert all(a[0] == b[0] or a[1] == b[1] for a, b in case.wires)
    for one, other in itertools.combinations(case.wires, 2):
        if (one[0][0] == one[1][0]) != (other[0][0] == other[1][0]):
            upright, level = (one, other) if one[0][0] == one[1][0] else (other, one)
            point = (upright[0][0], level[0][1])
            if touches(point, upright) and touches(point, level):
                corner = point in upright and point in level
                assert point in case.dots or corner


def test_a_dot_is_where_three_wires_meet_and_nowhere_else(case: Drawn) -> None:
    met = {}
    for wire in case.wires:
        for end in wire:
            met[end] = met.get(end, 0) + 1
    assert {point for point, count in met.items() if count > 2} == case.dots


def test_series_members_share_a_wire_and_lie_in_a_line(plan) -> None:
    drawing = drawn(plan, parse_network(CASES["series"]))
    assert len(drawing.wires) == 3  # from a terminal to a, from a to b, from b to a terminal
    a, b = drawing.boxes["a"], drawing.boxes["b"]
    assert (a.y0, a.y1) == (b.y0, b.y1)
    assert ((a.x1, 0.5 * (a.y0 + a.y1)), (b.x0, 0.5 * (b.y0 + b.y1))) in drawing.wires
    assert drawing.dots == set()


def test_parallel_members_are_rungs_between_the_same_rails(plan) -> None:
    drawing = drawn(plan, parse_network(CASES["parallel"]))
    left, right = zip(*ends(drawing), strict=True)
    assert len(set(left)) == len(set(right)) == 1
    assert len({0.5 * (box.x0 + box.x1) for box in drawing.boxes.values()}) == 1
    heights = [box.y0 for box in drawing.boxes.values()]
    assert heights == sorted(heights, reverse=True)  # in the order of the text form, from the top
    upright = {x for (x, y0), (_, y1) in drawing.wires if y0 != y1}
    assert len(upright) == 2


def test_rungs_inside_rungs_use_the_same_rails(plan) -> None:
    # Parallel is associative: the same four wires meet whether or not the inner pair has brackets.
    nested = drawn(plan, parse_network("(red 1k || blue 2k) || red 3k"))
    plain = drawn(plan, parse_network("red 1k || blue 2k || red 3k"))
    assert nested.wires == plain.wires


# --- what is drawn, and where -----------------------------------------------------------------


def test_every_leg_is_drawn_once_with_its_id_material_and_value(case: Drawn) -> None:
    members = legs(case.network)
    ids = leg_names(len(members))
    assert list(case.boxes) == list(ids) == list(case.artists.words)
    note = case.artists.note.get_text() if case.artists.note else ""
    for name, leg in zip(ids, members, strict=True):
        words = [line.get_text() for line in case.artists.words[name]]
        if note == IDS_NOTE:
            assert words == [name]
            continue
        head, tail = words[0].removeprefix(f"{name}: ").split("…") if "…" in words[0] else (None, None)
        assert words[0].startswith(f"{name}: ")
        assert words[0] == f"{name}: {leg.material}" or (note == CUT_NOTE and head is not None)
        if head is not None:
            assert leg.material.startswith(head)
            assert leg.material.endswith(tail)
        assert words[1] == format_ohms(leg.ohms)


def test_words_stand_over_and_under_the_box_of_their_leg(case: Drawn) -> None:
    for name, lines in case.artists.words.items():
        box = case.boxes[name]
        for line, side in zip(lines, (1, -1), strict=False):
            x, y = line.get_position()
            assert x == pytest.approx(0.5 * (box.x0 + box.x1))
            assert side * (y - 0.5 * (box.y0 + box.y1)) > 0.5 * box.height


def test_a_resistor_is_a_plain_rectangle_longer_than_high(case: Drawn) -> None:
    # IEC 60617: a rectangle, about three times as long as high; from memory.
    sizes = {(round(box.width, 6), round(box.height, 6)) for box in case.boxes.values()}
    ((width, height),) = sizes
    assert 2.0 <= width / height <= 3.5
    across, up = case.ax.transData.transform((1, 1)) - case.ax.transData.transform((0, 0))
    assert across == pytest.approx(up)


def shrunk(box: Bbox, by: float = 0.3) -> Bbox:
    return Bbox.from_extents(box.x0 + by, box.y0 + by, box.x1 - by, box.y1 - by)


def assert_nothing_is_covered(drawing: Drawn) -> None:
    texts = list(drawing.words())
    things = [*((name, box) for name, box in drawing.boxes.items()), *texts]
    for (one, a), (other, b) in itertools.combinations([(n, shrunk(box)) for n, box in things], 2):
        assert not a.overlaps(b), (one, other)
    for (x0, y0), (x1, y1) in drawing.wires:
        wire = Bbox.from_extents(x0, y0, x1, y1).padded(0.2)
        for name, box in things:
            assert not wire.overlaps(shrunk(box)), name
    page = drawing.figure.bbox.transformed(drawing.ax.transData.inverted())
    for name, box in things:
        assert page.x0 <= box.x0 <= box.x1 <= page.x1, name
        assert page.y0 <= box.y0 <= box.y1 <= page.y1, name


def test_nothing_covers_anything_or_leaves_the_page(case: Drawn) -> None:
    assert_nothing_is_covered(case)


def test_terminals_are_open_circles_at_both_ends_of_one_line(case: Drawn) -> None:
    (left, y), (right, same) = case.terminals
    assert y == same
    assert left < min(x for wire in case.wires for x, _ in wire) <= min(b.x0 for b in case.boxes.values())
    assert right > max(x for wire in case.wires for x, _ in wire) >= max(b.x1 for b in case.boxes.values())
    assert case.artists.terminals.get_markerfacecolor() == "white"


# --- size and detail --------------------------------------------------------------------------


def note_of(text: str) -> str:
    return sketch_of(parse_network(text)).note


def test_whole_names_while_they_fit_then_cut_names_then_small_text_then_ids() -> None:
    assert note_of(CASES["long names"]) == ""
    assert note_of(CASES["cut names"]) == CUT_NOTE
    small = sketch_of(parse_network(CASES["small text"]))
    assert small.note == ""
    assert LEAST_SCALE <= small.scale < 1.0
    assert note_of(CASES["most in series"]) == IDS_NOTE
    assert note_of(CASES["deepest"]) == IDS_NOTE


def test_text_is_legible_on_paper(case: Drawn) -> None:
    # Five points is taken as the least that can be read on paper (common practice, no source).
    sizes = {line.get_fontsize() for lines in case.artists.words.values() for line in lines}
    assert len(sizes) == 1
    assert 5.0 <= sizes.pop() <= TEXT_SIZE


def test_the_page_is_as_small_as_the_drawing_and_its_limit_holds_unless_ids_alone_need_more(
    case: Drawn,
) -> None:
    width, height = case.figure.get_size_inches() * 72.0
    sketch = sketch_of(case.network)
    assert height <= sketch.size[1] + 60.0
    if sketch.note != IDS_NOTE:
        assert width <= PAGE[0] + 20.0
        assert height <= PAGE[1] + 60.0
    assert max(width, height) <= 16 * 72.0


def test_a_drawing_made_for_a_page_fits_smaller_axes_too(plan) -> None:
    figure = Figure(figsize=(2.0, 1.5))
    ax = figure.add_axes((0.0, 0.0, 1.0, 1.0))
    network = parse_network(TWELVE)
    drawing = Drawn(network, figure, ax, draw_network(ax, replace(plan.best, network=network)))
    assert_nothing_is_covered(drawing)


def test_the_title_names_the_option_its_total_and_where_it_is_stated(plan) -> None:
    option = replace(plan.best, id="$x^{$", network=parse_network(CASES["series"]))
    figure = network_figure(replace(plan, options=(option,), chosen="$x^{$"))
    figure.draw(FigureCanvasAgg(figure).get_renderer())  # with settings that read mathematics
    assert figure.axes[0].get_title(loc="left") == "$x^{$: 18.01 kohm at 25 °C"


def test_no_words_are_read_as_mathematics(case: Drawn) -> None:
    assert not any(line.get_parse_math() for lines in case.artists.words.values() for line in lines)
