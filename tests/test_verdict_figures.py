"""The figure of the rates against pressure: lines are the rates, dots lie where lines meet, words do not overlap."""

from __future__ import annotations

from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Annotation

from pertcalc.constants import BOHR_MAGNETON_J_T, HBAR_J_S
from pertcalc.errors import InputError
from pertcalc.report import verdict_figures as figures
from pertcalc.report.verdict_figures import draw_rates, pressure_range, save_rates
from pertcalc.report.verdict_lines import ground_lines
from pertcalc.units import density_cm3
from pertcalc.vapour import verdict as verdicts
from pertcalc.vapour.excited import DECAY
from pertcalc.vapour.fill import IMPACT_LIMIT, impact_parameter
from pertcalc.vapour.ground import TRANSIT, WALL
from pertcalc.vapour.ground_balance import FAST_EXCHANGE, PUMPING, RESOLVING, decays_at
from pertcalc.vapour.pairs import PAIRS
from pertcalc.vapour.pump_light import pump_light
from pertcalc.vapour.pumping import pumping
from pertcalc.vapour.question import ask
from pertcalc.vapour.spin_destruction import BY_ALKALI, BY_GAS, EXCHANGE
from pertcalc.vapour.verdict import impact_pressure
from tests.report_fakes import fake_rates
from tests.vapour_cases import invented

LIGHT = {"power_W": 1e-3, "beam_diameter_cm": 0.5}
CASES = {
    "Rb Ar": ("Rb", "Ar", {"cell": "sphere 25 mm"} | LIGHT),
    "Cs He": ("Cs", "He", {}),
    "K Xe": ("K", "Xe", {"field_G": 0.0, "pressure_torr": 0.02, "wall": "coated"}),
    "Na Ne": ("Na", "Ne", {"field_G": 80.0, "pressure_torr": 3000.0}),
}


@pytest.fixture(scope="module")
def found():
    """Verdicts on invented collision rates and invented sticking: no collision and no molecule is computed."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(verdicts, "collision_rates", fake_rates)
        sticking = replace(invented(8e-23, "cm^3"), error=2e-23), replace(invented(40.0, "1"), error=5.0)
        patch.setattr(verdicts, "_sticking", lambda question: sticking)
        return {name: verdicts.verdict(ask(a, gas, **more)) for name, (a, gas, more) in CASES.items()}


@pytest.fixture(scope="module")
def drawn(found):
    return {name: draw_rates(one) for name, one in found.items()}


def line(axes, start: str):
    """The one line whose legend begins with the words, however they are broken."""
    hits = [one for one in axes.lines if flat(one.get_label()).startswith(start)]
    assert len(hits) == 1, f"{start!r}: {[flat(one.get_label()) for one in axes.lines]}"
    return np.asarray(hits[0].get_xdata()), np.asarray(hits[0].get_ydata())


def at(axes, start: str, pressure: float) -> float:
    """Value of a line at a pressure, linear in the logarithms."""
    x, y = line(axes, start)
    return float(np.exp(np.interp(np.log(pressure), np.log(x), np.log(y))))


def flat(words: str) -> str:
    return words.replace("\n", " ").replace("\u00a0", " ")


def legend(axes) -> str:
    return " | ".join(flat(one.get_text()) for one in axes.get_legend().get_texts())


def dots(axes) -> list[tuple[float, float]]:
    return [(float(one.get_xdata()[0]), float(one.get_ydata()[0])) for one in axes.lines if one.get_marker() == "o"]


def band(axes, pressure: float) -> list[tuple[float, float]]:
    """Edges of every error band at its point nearest to a pressure."""
    edges = []
    for one in axes.collections:
        x, y = one.get_paths()[0].vertices.T
        near = np.isclose(x, x[np.argmin(np.abs(np.log(x / pressure)))], rtol=1e-12)
        edges.append((float(y[near].min()), float(y[near].max())))
    return sorted(edges)


@pytest.mark.parametrize("case", CASES)
def test_excited_lines_are_the_rates_of_the_verdict(found, drawn, case):
    one, axes = found[case], drawn[case].axes[0]
    p = one.question.fill.pressure_torr
    for level, K in (("P1/2", 1), ("P3/2", 2)):
        balance = one.balances[level][K]
        assert at(axes, f"{level} loss of K={K}", p) == pytest.approx(balance.collisional.value, rel=1e-9)
        x, y = line(axes, f"{level} loss of K={K}")
        assert y / x == pytest.approx(np.full(len(x), y[0] / x[0]))  # binary collisions: proportional to the density
        assert set(line(axes, f"{level} {DECAY}")[1]) == {balance.radiative.value}
        if one.question.fill.field_G > 0:
            assert set(line(axes, f"{level} Larmor")[1]) == {balance.larmor}
        else:
            assert f"{level} Larmor frequency at 0 G" in legend(axes) and ": zero" in legend(axes)


def test_dots_lie_where_collisions_meet_the_larger_of_decay_and_field(found, drawn):
    for case, rival in (("Rb Ar", DECAY), ("Cs He", DECAY), ("Na Ne", "Larmor")):
        axes, marks = drawn[case].axes[0], dots(drawn[case].axes[0])
        assert len(marks) == 2
        for x, y in marks:
            met = [
                level
                for level, K in (("P1/2", 1), ("P3/2", 2))
                if at(axes, f"{level} loss of K={K}", x) == pytest.approx(y, rel=1e-6)
                and at(axes, f"{level} {rival}", x) == pytest.approx(y, rel=1e-6)
            ]
            assert len(met) == 1, f"{case}: dot at {x} Torr, {y} s^-1"
    # 80 G in gas that hides the hyperfine structure: g_J = 4/3 and 2/3 of the P levels, Lande's formula with g_s = 2.
    field = 80e-4 * BOHR_MAGNETON_J_T / HBAR_J_S
    heights = sorted(y for _, y in dots(drawn["Na Ne"].axes[0]))
    assert heights == pytest.approx([field * 2 / 3, field * 4 / 3], rel=2e-3)


def test_crossovers_are_written_with_their_error(found, drawn):
    axes, balance = drawn["Rb Ar"].axes[0], found["Rb Ar"].balances["P3/2"][2]
    words = [flat(one.get_text()) for one in axes.texts if isinstance(one, Annotation)]
    assert len(words) == 2 and all("Torr" in one and "\u00b1" in one for one in words)
    (own,) = [one for one in words if one.startswith("P3/2")]
    value, error = (float(one) for one in own.split("K=2 ")[1].removesuffix(" Torr").split(" \u00b1 "))
    assert value == pytest.approx(balance.crossover_pressure_torr, rel=0.06)  # two digits
    assert error == pytest.approx(balance.crossover_pressure_error * balance.crossover_pressure_torr, rel=0.4)  # one


def test_bands_are_the_errors(found, drawn):
    one, axes = found["Rb Ar"], drawn["Rb Ar"].axes[0]
    (x_low, *_, x_high), _ = line(axes, "P3/2 loss")
    for x in (x_low, x_high):
        expected = []
        for level, K in (("P1/2", 1), ("P3/2", 2)):
            loss, share = one.balances[level][K].collisional, x / one.question.fill.pressure_torr
            assert loss.error == pytest.approx(np.hypot(0.003, 0.2) * loss.value)  # the errors of the invented rates
            expected.append(((loss.value - loss.error) * share, (loss.value + loss.error) * share))
        assert np.array(band(axes, x)) == pytest.approx(np.array(sorted(expected)))
    total, p = one.ground.total, one.question.fill.pressure_torr
    low, high = band(drawn["Rb Ar"].axes[1], p)[0]
    assert (low, high) == pytest.approx((total.value - total.error, total.value + total.error), rel=1e-9)


def test_without_an_error_there_is_no_band_and_the_legend_asks(found):
    one = found["Cs He"]
    ranks = dict(one.balances["P3/2"])
    ranks[2] = replace(ranks[2], collisional=replace(ranks[2].collisional, error=None), crossover_pressure_error=None)
    axes = draw_rates(replace(one, balances=one.balances | {"P3/2": ranks})).axes[0]
    assert len(axes.collections) == 1
    assert "P3/2 loss of K=2 by collisions, \u00b1?, COMPUTED" in legend(axes)
    (words,) = [flat(t.get_text()) for t in axes.texts if t.get_text().startswith("P3/2")]
    assert "\u00b1" not in words


@pytest.mark.parametrize("case", CASES)
def test_sum_is_the_sum_of_what_destroys(found, case):
    one = found[case]
    lines = ground_lines(one, *pressure_range(one))
    parts = [lines.rates[name] for name in (WALL, TRANSIT, BY_GAS, PAIRS, BY_ALKALI) if name in lines.rates]
    assert lines.rates[figures.SUM] == pytest.approx(np.nansum(parts, axis=0), rel=1e-12)
    here = np.searchsorted(lines.pressures, one.question.fill.pressure_torr)
    assert lines.rates[figures.SUM][here] == pytest.approx(one.ground.total.value, rel=1e-12)
    for decay in one.ground.decays:
        value = np.nan if decay.rate is None else decay.rate.value
        assert lines.rates[decay.name][here] == pytest.approx(value, rel=1e-12, nan_ok=True)


def test_ground_lines_are_drawn_as_computed(found, drawn):
    one, axes = found["Rb Ar"], drawn["Rb Ar"].axes[1]
    lines = ground_lines(one, *pressure_range(one))
    labels = {name: name for name in (WALL, TRANSIT, BY_GAS, PAIRS, BY_ALKALI, EXCHANGE, PUMPING)}
    labels |= {WALL: "wall,", figures.SUM: "sum", figures.WALLS: figures.WALLS, figures.GAS: figures.GAS}
    for name, start in labels.items():
        x, y = line(axes, start)
        assert np.array_equal(x, lines.pressures) and np.array_equal(y, lines.rates[name]), name
    exchange = next(words for words in legend(axes).split(" | ") if words.startswith(EXCHANGE))
    assert exchange.endswith("(destroys none)")
    widths = {flat(one.get_label()).split(",")[0]: one.get_linewidth() for one in axes.lines}
    assert widths["sum"] == max(widths.values()) and widths[EXCHANGE] < 1


def test_walls_and_gas_meet_at_the_dot(found, drawn):
    for case in ("Rb Ar", "Cs He"):
        one, ((x, y),) = found[case], dots(drawn[case].axes[1])
        factor = x / one.question.fill.pressure_torr
        light = pump_light(one.question, one.isotope, one.lines, one.rates, factor)
        rates = {p.name: p.rate for p in decays_at(one.ground, factor, light) if p.rate}
        for names in ((WALL, TRANSIT), (BY_GAS, PAIRS)):
            assert sum(rates[n].value for n in names if n in rates) == pytest.approx(y, rel=1e-6)
    axes = drawn["Rb Ar"].axes[1]
    ((x, y),) = dots(axes)
    assert at(axes, figures.WALLS, x) == pytest.approx(y, rel=1e-6)
    assert at(axes, figures.GAS, x) == pytest.approx(y, rel=1e-6)
    (words,) = [flat(one.get_text()) for one in axes.texts]
    assert words.startswith("walls = gas") and words.endswith("Torr")


def light_at(one, factor: float) -> float:
    """Decay of <F_z> by the light with the pressure of the cell times a factor, as the figure draws it."""
    p = factor * one.question.fill.pressure_torr
    lines = ground_lines(one, p, 1.1 * p)
    return lines.rates[PUMPING][np.argmin(np.abs(lines.pressures - p))]


def test_pumping_follows_the_pressure(found):
    one = found["Rb Ar"]
    assert light_at(one, 1.0) == pytest.approx(one.ground.pumping.value, rel=1e-9)
    # Without gas the excited level keeps its orientation: only repopulation pumping is left.
    line, light = one.lines["D1"], one.question.light
    free = pumping(replace(line, fwhm_rad_s=0.0, shift_rad_s=0.0), light.beam)
    assert free.spin.kind == "repopulation"
    # Narrow light on a narrow line takes whole atoms of one F: the nucleus does not slow it.
    assert light_at(one, 1e-8) == pytest.approx(free.spin.damping, rel=1e-6)
    # Far beyond Doppler width and hyperfine structure the peak of a Lorentz line falls as 1/width, that is 1/density.
    assert light_at(one, 4000.0) / light_at(one, 8000.0) == pytest.approx(2.0, rel=1e-2)


def test_where_the_light_no_longer_resolves_the_ground_level_its_line_steps(found, drawn):
    """Without fast spin exchange <F_z> of 85Rb decays at 2/(2I+1)^2 = 1/18 of the damping of the electron spin."""
    lines = ground_lines(found["Rb Ar"], *pressure_range(found["Rb Ar"]))
    ((x, side, _),) = [step for step in lines.steps if step[2] == RESOLVING]
    i = np.searchsorted(lines.pressures, x)
    below, above = lines.rates[PUMPING][i - 1 : i + 1]
    assert side == "below" and below / above == pytest.approx(18.0, rel=1e-6)
    assert f"{RESOLVING} below" in legend(drawn["Rb Ar"].axes[1])


def test_where_spin_exchange_stops_to_be_fastest_the_lines_step(found, drawn):
    """Closed forms of both limits: G/q, q = [4I(I+1)+3]/3, and 2G/(2I+1)^2; 133Cs has I = 7/2."""
    one = found["Cs He"]
    lines = ground_lines(one, *pressure_range(one))
    fastest = [x for x, _, what in lines.steps if what == FAST_EXCHANGE]
    assert len(fastest) == 2
    ratio = (2 / 8**2) / (3 / (4 * 3.5 * 4.5 + 3))
    for x, turn in zip(fastest, (1 / ratio, ratio), strict=True):
        i = np.searchsorted(lines.pressures, x)
        below, above = lines.rates[BY_GAS][i - 1 : i + 1]
        assert above / below == pytest.approx(turn, rel=1e-7)
    assert "spin exchange is fastest above" in legend(drawn["Cs He"].axes[1])


@pytest.mark.parametrize("case", CASES)
def test_shade_begins_where_collisions_overlap(found, drawn, case):
    one, axes = found[case], drawn[case].axes[0]
    name, limit = impact_pressure(one)
    rates, fill = one.rates, one.question.fill
    assert name == "D2"  # the wider of the invented lines, and the one the duration is taken from
    n = float(density_cm3(limit, fill.fill_temperature_K))
    product = impact_parameter(float(rates.fwhm["D2"].values[0]), fill.temperature_K, rates.reduced_mass, n)
    assert product == pytest.approx(IMPACT_LIMIT)
    low, high = axes.get_xlim()
    spans = list(axes.patches)
    if limit < high:
        assert spans[0].get_x() == pytest.approx(max(low, limit))
        assert spans[0].get_x() + spans[0].get_width() == pytest.approx(high)
    else:
        assert not spans and "off the axis" in legend(axes)


@pytest.mark.parametrize("case", CASES)
def test_axes_have_units_and_reach_around_the_cell_and_its_crossovers(found, drawn, case):
    one, (top, bottom) = found[case], drawn[case].axes
    assert bottom.get_xlabel().endswith("[Torr]")
    assert all("[s$^{-1}$]" in axes.get_ylabel() for axes in (top, bottom))
    p, (low, high) = one.question.fill.pressure_torr, top.get_xlim()
    assert low <= p / 100 and high >= 100 * p and (low, high) == bottom.get_xlim()
    for axes in (top, bottom):
        assert any(list(upright.get_xdata()) == [p, p] for upright in axes.lines)
        assert axes.get_xscale() == axes.get_yscale() == "log"
    meets = [one.balances["P1/2"][1].crossover_pressure_torr, one.balances["P3/2"][2].crossover_pressure_torr]
    assert len(dots(top)) == sum(low <= meet <= high for meet in meets)
    words = legend(bottom)
    assert f"unknown: {', '.join(one.ground.unknown)}" in words if one.ground.unknown else "unknown" not in words


def test_a_crossover_out_of_reach_is_said_in_words(found):
    one = found["K Xe"]
    ranks = {1: replace(one.balances["P1/2"][1], crossover_pressure_torr=3e7)}
    far = replace(one, balances=one.balances | {"P1/2": ranks})
    axes = draw_rates(far).axes[0]
    assert len(dots(axes)) == 1 and axes.get_xlim()[1] < 3e7
    assert "P1/2: collisions equal radiative decay at 3.0e+07" in legend(axes)


@pytest.mark.parametrize("case", CASES)
def test_no_words_lie_on_others(drawn, case):
    figure = drawn[case]
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    renderer = canvas.get_renderer()
    boxes = {"title": figure._suptitle.get_window_extent(renderer)}
    for number, axes in enumerate(figure.axes):
        boxes[f"legend {number}"] = axes.get_legend().get_window_extent(renderer)
        for text in (*axes.texts, axes.xaxis.label, axes.yaxis.label):
            if text.get_text():
                boxes[f"{number} {text.get_text()}"] = text.get_window_extent(renderer)
        for text in axes.texts:
            if isinstance(text, Annotation):
                box, frame = text.get_window_extent(renderer), axes.get_window_extent(renderer)
                assert frame.x0 <= box.x0 and box.x1 <= frame.x1 and frame.y0 <= box.y0 and box.y1 <= frame.y1
    for (first, a), (second, b) in combinations(boxes.items(), 2):
        assert not a.overlaps(b), f"{first!r} lies on {second!r}"
    width, height = canvas.get_width_height()
    assert all(b.x0 >= 0 and b.y0 >= 0 and b.x1 <= width and b.y1 <= height for b in boxes.values())


def test_files_repeat_and_bad_orders_are_refused(found, tmp_path):
    one = found["Cs He"]
    first = save_rates(one, tmp_path / "a.svg").read_bytes()
    assert save_rates(one, tmp_path / "b.svg").read_bytes() == first
    assert save_rates(one, tmp_path / "c.png").read_bytes()[:8] == b"\x89PNG\r\n\x1a\n"
    with pytest.raises(InputError, match=r"\.png or \.svg"):
        save_rates(one, tmp_path / "a.pdf")
    with pytest.raises(InputError, match="cannot be written"):
        save_rates(one, tmp_path / "missing" / "a.png")
    with pytest.raises(InputError, match="leave --plot out, or name a gas"):
        save_rates(verdicts.verdict(ask("Rb", "none")), tmp_path / "d.png")
    assert not (tmp_path / "d.png").exists()
