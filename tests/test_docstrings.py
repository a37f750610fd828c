"""The examples in the docstrings of the public names, run as they stand, and that none lacks one."""

from __future__ import annotations

import doctest
import importlib
import inspect
import math
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import porkgrid

TERN = """
name = "Tern to Mars"

[[encounter]]
body = "earth"
first = 2028-11-01
last = 2029-01-10
step_days = 1.0
parking = { periapsis_altitude_km = 200, apoapsis_altitude_km = 200 }

[[encounter]]
body = "mars"
first = 2029-07-01
last = 2030-01-20
step_days = 7.0
capture = { periapsis_altitude_km = 400, apoapsis_altitude_km = 33000 }

[limits]
c3_km2_s2 = { max = 25 }
v_inf_arrival_km_s = { max = 4.5 }
"""


def members() -> Iterator[tuple[str, Any]]:
    """Every public name and every public member that the package's classes of our own define."""
    for name in porkgrid.__all__:
        value = getattr(porkgrid, name)
        yield name, value
        if not inspect.isclass(value):
            continue
        for owner in value.__mro__:
            if not owner.__module__.startswith("porkgrid"):
                continue
            for attribute, member in vars(owner).items():
                if not attribute.startswith("_") and callable(getattr(member, "__get__", None)):
                    yield f"{name}.{attribute}", member


DOCUMENTED = {name: member for name, member in members() if name != "Scenario.model_config"}


@pytest.fixture(scope="module")
def survey(tmp_path_factory):
    """The survey of the examples, in a folder laid out as they say."""
    place = tmp_path_factory.mktemp("examples")
    file = place / "scenarios" / "tern-to-mars.toml"
    file.parent.mkdir()
    file.write_text(TERN)
    (place / "surveys").mkdir()
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(place)
        yield porkgrid.sweep(
            porkgrid.load_scenario(Path("scenarios/tern-to-mars.toml")), "surveys/tern-to-mars"
        )


@pytest.mark.parametrize(
    "name",
    [
        pytest.param(name, marks=pytest.mark.slow) if name in ("Survey.handoff", "Survey.chart") else name
        for name in DOCUMENTED
    ],
)
def test_examples_do_what_they_show(survey, name):
    member = DOCUMENTED[name]
    text = inspect.getdoc(getattr(member, "func", member) if not inspect.isclass(member) else member)
    assert text, f"{name} has no docstring"
    given = {"porkgrid": porkgrid, "survey": survey, "math": math, "np": np}
    example = doctest.DocTestParser().get_doctest(text, given, name, None, None)
    assert example.examples, f"{name} has no example"
    said: list[str] = []
    doctest.DocTestRunner(verbose=False).run(example, out=said.append)
    assert not said, "".join(said)


def test_the_public_names_are_those_of_the_design():
    names = {"Scenario", "Survey", "lambert", "load_scenario", "open_survey", "sweep"}
    assert names | {"RequestError", "RunError"} == set(porkgrid.__all__)
    assert {
        f"Survey.{each}" for each in ("grid", "candidates", "chart", "rank", "period")
    } <= DOCUMENTED.keys()


def test_every_public_callable_types_all_it_takes_and_returns():
    for name, member in DOCUMENTED.items():
        function = member.fget if isinstance(member, property) else getattr(member, "func", member)
        if inspect.isclass(function):
            continue
        signature = inspect.signature(function)
        assert signature.return_annotation is not inspect.Signature.empty, name
        bare = [
            each.name
            for each in signature.parameters.values()
            if each.annotation is inspect.Parameter.empty and each.name != "self"
        ]
        assert not bare, f"{name}: {bare}"


def test_lazy_names_are_typed_for_checkers_as_they_are_found():
    """What type checkers read under TYPE_CHECKING is where the names come from."""
    source = Path(inspect.getsourcefile(porkgrid) or "").read_text()
    for name in porkgrid.__all__:
        home = importlib.import_module(getattr(porkgrid, "_HOMES")[name])  # noqa: B009 - private by name
        assert f"from {home.__name__} import {name} as {name}" in source
