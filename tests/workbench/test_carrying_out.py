"""From a plan to what was done: planned, partly done, done and not done are never mixed up."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fertui.planning.values import RecipeChange
from fertui.refusals import Refusal
from fertui.workbench import open_site
from fertui.workbench.bench import Bench
from fertui.workbench.carrying_out import PlanItem, acids_of, check_strength, in_words, standing
from tests.paper.hand_made import SITE, acid, acid_step, hand_plan, recipe_change, renewal, stocks

LETTUCE = {"loop": "lettuce"}


@pytest.fixture
def bench(demo: Path) -> Bench:
    return open_site(demo)


def accepted(bench: Bench, **changes: object) -> tuple[PlanItem, ...]:
    """The steps of a hand-made plan as the demo's logbook holds them."""
    steps = tuple(step for step in hand_plan().steps if step.salt != "MKP")
    bench.accept_plan(hand_plan(**LETTUCE, **{"steps": steps, **changes}), "RV")
    return bench.open_plans("lettuce")


def test_accepting_a_plan_logs_what_is_intended_and_nothing_as_done(bench: Bench) -> None:
    before = len(bench.book.entries(kinds=("dose", "acid", "bleed", "recipe")))
    items = accepted(bench, renewal=renewal())
    assert sorted((item.what, item.amount, item.unit, item.state) for item in items) == [
        ("bleed", 2500.0, "L", "planned"),
        ("potassium nitrate", 1.75, "kg", "planned"),
        ("potassium nitrate", 1.75, "kg", "planned"),
    ]
    assert len(bench.book.entries(kinds=("dose", "acid", "bleed", "recipe"))) == before


def test_a_renewal_is_the_first_step_or_its_salts_would_leave_with_it(bench: Bench) -> None:
    bench.accept_plan(hand_plan(**LETTUCE, renewal=renewal(), steps=hand_plan().steps[:1]), "RV")
    items = bench.open_plans("lettuce")
    assert [item.what for item in items] == ["bleed", items[1].what]
    assert items[0].at <= items[1].at


def test_a_plan_that_asks_for_nothing_cannot_be_accepted(bench: Bench) -> None:
    with pytest.raises(Refusal, match="asks for nothing"):
        accepted(bench, steps=())


def test_marking_done_logs_the_dose_as_planned_with_its_number(bench: Bench) -> None:
    item = accepted(bench)[0]
    done = bench.mark_done(item.number, "AN")
    assert (done.kind, done.loop, done.by) == ("dose", "lettuce", "AN")
    assert (done.text_of("salt"), done.number_of("kg"), done.number_of("plan")) == (
        "potassium nitrate",
        1.75,
        item.number,
    )
    after = {each.number: each for each in bench.open_plans("lettuce")}
    assert (after[item.number].state, after[item.number].done_number) == ("done", done.number)


def test_partly_done_counts_what_was_really_weighed_until_the_rest_is(bench: Bench) -> None:
    item = accepted(bench)[0]
    bench.mark_done(item.number, "AN", amount="1,0")
    (half,) = [each for each in bench.open_plans("lettuce") if each.number == item.number]
    assert (half.state, half.done_amount) == ("partly done", 1.0)
    assert in_words(half, "UTC").endswith("partly done: 1 kg")
    bench.mark_done(item.number, "AN", amount="0.75")
    (whole,) = [each for each in bench.open_plans("lettuce") if each.number == item.number]
    assert (whole.state, whole.done_amount) == ("done", 1.75)


def test_not_done_strikes_the_step_with_its_reason_and_no_dose_is_logged(bench: Bench) -> None:
    item = accepted(bench)[0]
    struck = bench.not_done(item.number, "bag was wet", "AN")
    assert (struck.void, struck.why, struck.supersedes) == (True, "bag was wet", item.number)
    assert item.number not in {each.number for each in bench.open_plans("lettuce")}
    assert all(each.number_of("plan") != item.number for each in bench.book.entries(kinds=("dose",)))


def test_a_struck_dose_is_no_dose_and_its_step_is_open_again(bench: Bench) -> None:
    item = accepted(bench)[0]
    done = bench.mark_done(item.number, "AN")
    assert done.number is not None
    bench.void(done.number, "wrong tank", "AN")
    assert next(each.state for each in bench.open_plans("lettuce") if each.number == item.number) == "planned"


def test_a_bleed_marked_done_is_a_bleed_with_the_litres_let_go(bench: Bench) -> None:
    item = next(each for each in accepted(bench, renewal=renewal()) if each.what == "bleed")
    done = bench.mark_done(item.number, "AN", amount="2000")
    assert (done.kind, done.number_of("litres"), done.text_of("reason")) == ("bleed", 2000.0, "renewal")
    assert next(each.state for each in bench.open_plans("lettuce") if each.number == item.number) == "partly done"


def test_a_recipe_marked_done_is_the_recipe_that_runs_from_then_on(bench: Bench) -> None:
    change = RecipeChange({"K": 8.5, "Ca": 4.0, "NO3": 14.0}, {}, 2.6, (), None)
    item = next(each for each in accepted(bench, recipe=change) if each.what == "recipe")
    done = bench.mark_done(item.number, "AN")
    assert (done.kind, done.number_of("K"), done.number_of("EC")) == ("recipe", 8.5, 2.6)
    assert next(each.state for each in bench.open_plans("lettuce") if each.number == item.number) == "done"


def test_a_recipe_planned_in_mg_of_nitrogen_is_carried_out_as_that(bench: Bench) -> None:
    # 210 mg/L N / 14.007 g/mol (CIAAW 2021) = 14.99 mmol/L NO3; read as mg of nitrate it would be 3.39.
    planned = bench.record("plan", {"recipe": "summer", "NO3-N": "210 mg/L", "K": "8", "by": "RV"}, "lettuce")
    done = bench.mark_done(planned.number or 0, "AN")
    assert done.number_of("NO3") == pytest.approx(14.99, rel=0.001)
    assert done.number_of("K") == 8.0


@pytest.mark.parametrize("read", [True, False])
def test_acid_marked_done_says_whether_its_cautions_were_acknowledged(bench: Bench, read: bool) -> None:
    # Logging what happened always works, and carries "cautions not acknowledged" where they were not.
    split = acid_step()._replace(acid="nitric acid 38", strength_pct=38.0, density_kg_per_l=1.233, litres=0.3)
    item = next(each for each in accepted(bench, acid=(split,)) if each.what == split.acid)
    done = bench.mark_done(item.number, "AN", strength_pct=38.0, read=read)
    assert (done.kind, done.number_of("litres"), done.number_of("strength")) == ("acid", 0.3, 38.0)
    assert done.text_of("cautions") == ("acknowledged" if read else "not acknowledged")


def test_only_plan_entries_can_be_marked_done(bench: Bench) -> None:
    reading = bench.book.entries(kinds=("reading",))[-1]
    assert reading.number is not None
    with pytest.raises(Refusal, match="not a plan"):
        bench.mark_done(reading.number, "AN")


def test_expected_water_and_light_are_no_steps(bench: Bench) -> None:
    bench.record("plan", {"crop": "600", "light_sum": "1800", "by": "RV"}, "lettuce")
    assert bench.open_plans("lettuce") == ()


@given(st.floats(0.1, 100.0), st.floats(0.0, 0.969))
def test_a_step_is_not_done_while_more_than_a_spoonful_is_missing(amount: float, part: float) -> None:
    item = PlanItem(1, datetime(2026, 7, 1, tzinfo=UTC), "MKP", amount, "kg", "tank", 2, amount * part)
    assert item.state == "partly done"
    assert item._replace(done_amount=amount).state == "done"
    assert item._replace(done_number=None, done_amount=None).state == "planned"


# Release of sheets with acid -----------------------------------------------------------------------------------------


def test_nothing_with_acid_is_released_without_the_strength_on_its_label(bench: Bench) -> None:
    with pytest.raises(Refusal, match="Read the cautions and give the strength"):
        bench.acknowledge(acid(), None)


@pytest.mark.parametrize("label", [38.0, 53.0, 65.0])
def test_a_label_of_another_strength_releases_nothing(bench: Bench, label: float) -> None:
    with pytest.raises(Refusal, match="nothing is released"):
        bench.acknowledge(acid(), label)


def test_the_right_label_releases(bench: Bench) -> None:
    bench.acknowledge(acid(), 60.0)
    bench.acknowledge(hand_plan(acid=(acid_step(),)), 60.2)


def test_a_sheet_without_acid_asks_for_nothing(bench: Bench) -> None:
    bench.acknowledge(hand_plan(), None)
    bench.acknowledge(stocks(), None)


def test_acid_in_a_stock_tank_is_acid_too(bench: Bench) -> None:
    sheet = stocks(acid=SITE.supplies[-1])
    assert acids_of(sheet) == (("nitric 60", 60.0),)
    change = recipe_change()
    carried = RecipeChange(change.ions_mmol_l, change.change_pct, change.ec, (), sheet)
    for made in (sheet, hand_plan(recipe=carried)):
        with pytest.raises(Refusal):
            bench.acknowledge(made, None)
        bench.acknowledge(made, 60.0)


def test_two_acids_of_different_strength_are_never_released_by_one_label() -> None:
    with pytest.raises(Refusal):
        check_strength([("nitric 60", 60.0), ("phosphoric 59", 75.0)], 60.0)


NOON = datetime(2026, 6, 1, 12, 0, tzinfo=UTC)


@pytest.mark.parametrize(
    ("days", "what", "unit", "done", "stands"),
    [
        (0.1, "potassium nitrate", "kg", None, True),
        (-0.1, "potassium nitrate", "kg", None, True),
        (-0.1, "potassium nitrate", "kg", 7, False),
        (1.0, "potassium nitrate", "kg", None, False),
        (-1.0, "potassium nitrate", "kg", None, False),
        (1.0, "nitric acid", "L", None, True),
        (1.0, "recipe", "", None, True),
        (1.0, "bleed", "L", None, False),
    ],
)
def test_what_a_plan_made_now_would_tell_again_stands(
    days: float, what: str, unit: str, done: int | None, stands: bool
) -> None:
    item = PlanItem(1, NOON + timedelta(days=days), what, 1.0, unit, "tank", done, 1.0 if done else None)
    assert bool(standing([item], NOON, "UTC")) == stands


def test_the_day_of_a_step_is_that_of_the_site() -> None:
    late = PlanItem(1, datetime(2026, 6, 1, 23, 0, tzinfo=UTC), "potassium nitrate", 1.0, "kg", "tank", None)
    assert standing([late], NOON, "UTC")
    assert not standing([late], NOON, "Europe/Paris")  # one in the morning of the day after


def test_what_was_just_logged_is_in_the_state_asked_for_next(bench: Bench) -> None:
    item = accepted(bench)[0]
    before = bench.today("lettuce")
    done = bench.mark_done(item.number, "AN")
    after = bench.today("lettuce")
    assert after.at - done.at >= timedelta(seconds=9)
    gained = after.points["tank"].ions["K"].mmol_l.value - before.points["tank"].ions["K"].mmol_l.value
    assert gained == pytest.approx(1.75 * 1e6 / 101.10 / 2000, rel=0.1)  # 101.10 g/mol: standard atomic weights
