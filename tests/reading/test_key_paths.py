"""Key paths are found as a reader of the file would find them."""

from __future__ import annotations

from typing import Any

import pytest

from wavejob.reading.key_paths import KeyPathError, find, with_value

VALUE: dict[str, Any] = {
    "grid": {"x": {"from": -1}},
    "potential": [
        {"barrier": {"height": 1}, "name": "first"},
        {"barrier": {"height": 2}, "name": "second"},
    ],
    "observables": ["norm", {"crossing": {"name": "out", "x": 3}}],
    "evolve": {"stop_when": {"position.x": {"below": 0}}, "until": 4},
}


@pytest.mark.parametrize(
    ("text", "path"),
    [
        ("grid.x.from", ("grid", "x", "from")),
        ("potential[1].barrier.height", ("potential", 1, "barrier", "height")),
        ("potential.second.barrier.height", ("potential", 1, "barrier", "height")),
        ("observables.out.crossing.x", ("observables", 1, "crossing", "x")),
        ("evolve.stop_when.position.x.below", ("evolve", "stop_when", "position.x", "below")),
        ("evolve.accuracy", ("evolve", "accuracy")),  # may be new
    ],
)
def test_a_path_is_found(text: str, path: tuple[str | int, ...]) -> None:
    assert find(text, VALUE) == path


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("grid.z.from", "`grid` has no `z`"),
        ("potential.third.barrier.height", "`potential` has no item named `third`"),
        ("potential[2].barrier.height", "`potential` has no item [2]"),
        ("grid.x.from.unit", "`grid.x.from` is `-1`, which has no `unit`"),
        ("gird.x", "the file has no `gird`"),
        ("a b..c", "`a b..c` is no key path"),
        ("", "nothing is no key path"),
        ("[0].x", "`[0].x` is no key path"),
    ],
)
def test_what_leads_nowhere_says_where_it_ends(text: str, said: str) -> None:
    with pytest.raises(KeyPathError) as found:
        find(text, VALUE)
    assert found.value.message == said
    assert found.value.fix


def test_a_value_is_replaced_and_the_rest_shared() -> None:
    changed = with_value(VALUE, ("potential", 1, "barrier", "height"), 5)
    assert changed["potential"][1] == {"barrier": {"height": 5}, "name": "second"}
    assert VALUE["potential"][1]["barrier"]["height"] == 2
    assert changed["potential"][0] is VALUE["potential"][0]
    assert changed["grid"] is VALUE["grid"]
