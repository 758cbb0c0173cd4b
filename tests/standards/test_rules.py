"""The rules built in, against the laws as quoted in the data file's sources."""

from __future__ import annotations

import pytest

from roaddisp.errors import NotYetError
from roaddisp.standards.rules import KINDS, later_standards, standard, standards

HEALTH_LONG = {"classroom", "playground", "home", "facade", "intake"}


@pytest.mark.parametrize(
    ("name", "level", "unit", "averaging"),
    [
        ("us-naaqs-1h", 100, "ppb", "1 h"),  # 40 CFR 50.11(b), 75 FR 6474
        ("us-naaqs-annual", 53, "ppb", "year"),  # 40 CFR 50.11(a)
        ("eu-2008-1h", 200, "ug/m3", "1 h"),  # 2008/50/EC Annex XI
        ("eu-2008-annual", 40, "ug/m3", "year"),
        ("eu-2008-nox-vegetation", 30, "ug/m3", "year"),  # critical level, as NO2
    ],
)
def test_levels(name: str, level: float, unit: str, averaging: str) -> None:
    rule = standard(name)
    assert (rule.level, rule.unit, rule.averaging) == (level, unit, averaging)
    assert rule.decimals == 0
    assert rule.law
    assert "verified" in rule.status


def test_every_standard_of_the_contract_is_known() -> None:
    assert {*standards(), *later_standards()} == {
        "us-naaqs-1h",
        "us-naaqs-annual",
        "california-1h",
        "california-annual",
        "eu-2008-1h",
        "eu-2008-annual",
        "eu-2008-nox-vegetation",
        "eu-2030-1h",
        "eu-2030-24h",
        "eu-2030-annual",
        "uk-1h",
        "uk-annual",
        "who-2021-24h",
        "who-2021-annual",
        "who-1h",
    }


@pytest.mark.parametrize("name", later_standards())
def test_what_a_later_version_judges_is_refused_with_that_reason(name: str) -> None:
    with pytest.raises(NotYetError, match=f"'{name}' comes with a later version"):
        standard(name)


def test_an_unknown_standard_is_told_what_there_is() -> None:
    with pytest.raises(ValueError, match="allowed: us-naaqs-1h, us-naaqs-annual"):
        standard("us-naaqs-8h")


def test_kinds_by_design_4_5() -> None:
    judged = {
        name: {kind for kind in KINDS if rule.judges(kind)} for name, rule in standards().items()
    }
    assert judged == {
        "us-naaqs-1h": HEALTH_LONG | {"roadside"},
        "us-naaqs-annual": HEALTH_LONG,
        "eu-2008-1h": HEALTH_LONG | {"roadside"},
        "eu-2008-annual": HEALTH_LONG,
        "eu-2008-nox-vegetation": {"vegetation"},
    }
    without_kind = [name for name, rule in standards().items() if rule.judges("")]
    assert without_kind == [name for name in standards() if name != "eu-2008-nox-vegetation"]


def test_description_names_form_limit_source_and_how_far_it_was_checked() -> None:
    text = standard("us-naaqs-1h").description()
    assert text["level"] == "100 ppb"
    assert "3 years" in text["years asked"]
    assert "1.8804" in text["conversion"]
    assert "from memory" in text["checked"]
    assert "40 CFR 50.11" in text["law"]
    assert "roadside, and no kind given" in text["judges"]
