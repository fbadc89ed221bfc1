"""Eh of a survey: electrode and temperature chains, check-solution policy, uncertainty, each with its finding."""

from types import SimpleNamespace

import numpy as np
import pandas as pd
import pytest

from gley.columns import columns
from gley.errors import UsageError
from gley.findings import Findings, Place
from gley.probe import to_Eh
from gley.settings import Settings
from tables import table


def survey(samples, checks=(), stations=(), facts=None, amounts=None):
    origin = SimpleNamespace(
        place=lambda row, column: Place("s.xlsx", "Samples", f"{column}{row}"),
        of=lambda kind, row, column: Place("s.xlsx", kind, f"{column}{row}"),
    )
    named = [{"sample": f"s{i}", **row} for i, row in enumerate(samples)]
    return SimpleNamespace(
        samples=table("samples", named),
        stations=table("stations", list(stations)),
        checks=table("checks", list(checks)),
        facts=facts or {},
        origin=origin,
        amounts=pd.DataFrame(amounts or {}, index=range(len(named))),
    )


FACTS = {"electrode": "Ag/AgCl, 3 M KCl"}
DAY = "2031-04-28"


def convert(made, **settings):
    findings = Findings()
    return to_Eh(made, Settings().replace(**settings), findings), findings


def test_eh_is_reading_plus_half_cell():
    # 217 mV at 10 °C: ISO 11271 Annex C
    eh, _ = convert(survey([{"ORP_mV": 100.0, "temperature_C": 10.0}], facts=FACTS))
    assert eh.loc[0, "Eh_mV"] == pytest.approx(317, abs=0.5)
    assert eh.loc[0, "Eh_status"] == "ok"
    assert "3 M KCl" in eh.loc[0, "Eh_basis"]


def test_nearest_declaration_wins_row_station_facts():
    rows = [
        {"ORP_mV": 0.0, "temperature_C": 25.0, "electrode": "SCE", "station": "A"},
        {"ORP_mV": 0.0, "temperature_C": 25.0, "station": "A"},
        {"ORP_mV": 0.0, "temperature_C": 25.0, "station": "B"},
    ]
    eh, _ = convert(survey(rows, stations=[{"station": "A", "electrode": "Ag/AgCl sat"}], facts=FACTS))
    assert list(eh["Eh_mV"]) == pytest.approx([244.4, 199, 207], abs=0.5)


def test_no_electrode_anywhere_is_refused_with_the_choices():
    with pytest.raises(UsageError, match=r"no reference electrode is named.*fill unknown"):
        convert(survey([{"ORP_mV": 0.0}]))


def test_option_fills_in_but_does_not_override_the_file():
    eh, findings = convert(survey([{"ORP_mV": 0.0, "temperature_C": 25.0}], facts=FACTS), probe={"electrode": "SCE"})
    assert eh.loc[0, "Eh_mV"] == pytest.approx(207)
    assert "probe.electrode_differs" in findings.rules()


def test_unknown_electrode_is_an_error_and_the_row_stays():
    eh, findings = convert(survey([{"ORP_mV": 5.0, "electrode": "gold"}, {"ORP_mV": 5.0}], facts=FACTS))
    assert len(eh) == 2
    assert np.isnan(eh.loc[0, "Eh_mV"])
    assert eh.loc[0, "Eh_status"] == "no reference electrode"
    (fault,) = findings.of("error")
    assert fault.rule == "probe.unknown_electrode"
    assert "electrode0" in str(fault.place)


@pytest.mark.parametrize("declared", ["Ag/AgCl", "model 9678"])
def test_option_serves_where_the_declared_electrode_cannot_be_used(declared):
    made = survey([{"ORP_mV": 0.0, "temperature_C": 25.0}], facts={"electrode": declared})
    eh, findings = convert(made, probe={"electrode": "Ag/AgCl, 3 M KCl"})
    assert eh.loc[0, "Eh_mV"] == pytest.approx(207)
    (said,) = [item for item in findings if item.rule == "probe.electrode_replaced"]
    assert declared in said.message
    assert "Ag/AgCl, 3 M KCl" in said.message
    assert not findings.of("error")


def test_own_offset():
    eh, _ = convert(survey([{"ORP_mV": 10.0, "temperature_C": 10.0}]), probe={"offset_mV": 200.0})
    assert eh.loc[0, "Eh_mV"] == pytest.approx(210)


def test_delivered_eh_needs_no_electrode():
    eh, _ = convert(survey([{"Eh_given_mV": 321.0, "temperature_C": 10.0}, {}]))
    assert eh.loc[0, "Eh_mV"] == 321.0
    assert eh.loc[0, "electrode_used"] == "hydrogen scale (already Eh)"
    assert eh.loc[1, "Eh_status"] == "no ORP reading"


def test_delivered_eh_that_contradicts_the_reading_is_said():
    eh, findings = convert(survey([{"ORP_mV": 0.0, "Eh_given_mV": 0.0, "temperature_C": 25.0}], facts=FACTS))
    assert eh.loc[0, "Eh_mV"] == pytest.approx(207)
    assert "probe.delivered_differs" in findings.rules()


def check(reading, time=None, solution="ZoBell", T=25.0, probe="P1", date=DAY):
    return {"date": date, "time": time, "probe": probe, "solution": solution, "temperature_C": T, "reading_mV": reading}


def sample(time=None, probe="P1", **more):
    return {"ORP_mV": 100.0, "temperature_C": 25.0, "date": DAY, "time": time, "probe": probe, **more}


def test_one_check_is_a_constant_offset():
    # ZoBell 430.3 mV at 25 °C (Nordstrom 1977), 3 M KCl 207 mV: a perfect probe reads 223.3 mV; this one 4 mV less
    eh, findings = convert(survey([sample()], [check(219.3)], facts=FACTS))
    assert eh.loc[0, "check_offset_mV"] == pytest.approx(4.0, abs=0.1)
    assert eh.loc[0, "Eh_mV"] == pytest.approx(311.0, abs=0.1)
    assert findings.rules() == ["probe.check_good"]


def test_between_two_checks_the_offset_is_linear_in_time():
    checks = [check(223.3, "08:00"), check(213.3, "16:00")]
    eh, _ = convert(survey([sample("08:00"), sample("12:00"), sample("16:00"), sample("18:00")], checks, facts=FACTS))
    assert list(eh["check_offset_mV"]) == pytest.approx([0, 5, 10, 10], abs=0.1)


def test_check_at_another_temperature_uses_both_curves_there():
    # 10 °C: ZoBell 467.2, 3 M KCl 217: a perfect probe reads 250.2 mV
    eh, _ = convert(survey([sample()], [check(250.2, T=10.0)], facts=FACTS))
    assert eh.loc[0, "check_offset_mV"] == pytest.approx(0.0, abs=0.2)


@pytest.mark.parametrize(
    ("reading", "rule"),
    [(218.3, "good"), (215.3, "accepted"), (209.3, "flagged"), (200.3, "failed")],
)
def test_policy_by_size_of_the_deviation(reading, rule):
    # windows of 5, 10 and 15 mV: common practice
    _, findings = convert(survey([sample()], [check(reading)], facts=FACTS))
    assert f"probe.check_{rule}" in findings.rules()


def test_failed_check_is_not_applied_and_both_values_are_given():
    # the probe reads as if it were filled with saturated KCl (199 instead of 207 mV) and 10 mV more
    eh, findings = convert(survey([sample()], [check(203.3)], facts=FACTS))
    assert eh.loc[0, "Eh_mV"] == pytest.approx(307)
    assert np.isnan(eh.loc[0, "check_offset_mV"])
    said = next(item for item in findings if item.rule == "probe.check_not_applied")
    assert "307" in said.message
    assert "327" in said.message


def test_failed_check_names_the_fill_that_explains_it():
    # declared 3 M KCl (207 mV), really 1 M (236 mV): ZoBell reads 430.3 − 236 = 194.3 mV
    _, findings = convert(survey([sample()], [check(194.3)], facts=FACTS))
    said = next(item for item in findings if item.rule == "probe.check_failed")
    assert "Ag/AgCl, 1 M KCl" in said.message


@pytest.mark.parametrize(
    ("broken", "reason"),
    [
        ({"temperature_C": None}, "temperature is missing"),
        ({"reading_mV": None}, "reading is missing"),
        ({"solution": "lemonade"}, "isn't a check solution"),
    ],
)
def test_incomplete_check_is_a_finding_and_not_used(broken, reason):
    eh, findings = convert(survey([sample()], [{**check(219.3), **broken}], facts=FACTS))
    assert np.isnan(eh.loc[0, "check_offset_mV"])
    (said,) = [item for item in findings if item.rule == "probe.check_unusable"]
    assert reason in said.message


def test_check_of_another_probe_or_day_does_not_count():
    checks = [check(219.3, probe="P2"), check(219.3, date="2031-04-29")]
    eh, _ = convert(survey([sample()], checks, facts=FACTS))
    assert np.isnan(eh.loc[0, "check_offset_mV"])


def test_reading_without_a_check_is_said_where_the_survey_has_some():
    eh, findings = convert(survey([sample(probe="P-1"), sample()], [check(219.3)], facts=FACTS))
    assert np.isnan(eh.loc[0, "check_offset_mV"])
    assert eh.loc[1, "check_offset_mV"] == pytest.approx(4.0, abs=0.1)
    (said,) = [item for item in findings if item.rule == "probe.check_missing"]
    assert said.value == "1"
    assert "(s0)" in said.message


def test_reading_without_a_probe_takes_no_offset_from_two_probes():
    checks = [check(221.3, probe="P1"), check(211.3, probe="P2")]
    eh, findings = convert(survey([sample(probe="")], checks, facts=FACTS))
    assert eh.loc[0, "Eh_mV"] == pytest.approx(307)
    assert "several probes" in eh.loc[0, "Eh_basis"]
    assert "probe.check_unclear" in findings.rules()


def test_reading_without_a_probe_takes_the_one_probe_of_the_day():
    eh, _ = convert(survey([sample(probe="")], [check(219.3)], facts=FACTS))
    assert eh.loc[0, "check_offset_mV"] == pytest.approx(4.0, abs=0.1)


def test_check_serves_an_own_offset():
    # ZoBell 430.3 mV at 25 °C (Nordstrom 1977) − 221.3 − 205 = 4 mV
    eh, _ = convert(survey([sample()], [check(221.3)]), probe={"offset_mV": 205.0})
    assert eh.loc[0, "check_offset_mV"] == pytest.approx(4.0, abs=0.1)
    assert eh.loc[0, "Eh_mV"] == pytest.approx(309.0, abs=0.1)


def test_drift_between_checks_widens_the_common_part():
    checks = [check(223.3, "08:00"), check(213.3, "16:00")]
    eh, _ = convert(survey([sample("12:00")], checks, facts=FACTS))
    assert eh.loc[0, "Eh_sd_mV"] == pytest.approx(np.hypot(30, 5))
    assert eh.loc[0, "Eh_sd_common_mV"] == pytest.approx(np.hypot(5, 5))


def test_check_outside_the_range_of_its_solution_widens_the_sd():
    # Light is published at 25 °C only: 10 °C off at 1 mV/°C
    eh, findings = convert(survey([sample()], [check(461, solution="Light", T=15.0)], facts=FACTS))
    assert eh.loc[0, "Eh_sd_mV"] == pytest.approx(np.hypot(30, 10))
    assert "probe.check_outside" in findings.rules()
    # ZoBell rises by 2.4 mV/°C at 8 °C, the end of its range (Nordstrom 1977): 2 °C off
    eh, _ = convert(survey([sample()], [check(250, T=6.0)], facts=FACTS))
    assert eh.loc[0, "Eh_sd_mV"] == pytest.approx(np.hypot(30, 4.8), abs=0.05)


def test_sample_outside_the_range_of_its_electrode_widens_the_sd_and_is_said():
    eh, findings = convert(survey([{"ORP_mV": 0.0, "temperature_C": 4.0}], facts={"electrode": "SCE"}))
    assert eh.loc[0, "Eh_mV"] == pytest.approx(254, abs=0.5)  # held at 10 °C: ISO 11271 Annex C
    assert eh.loc[0, "Eh_sd_mV"] == pytest.approx(np.hypot(60, 6))
    assert findings.rules() == ["probe.outside_range"]


def test_limit_of_iron_does_not_make_a_water_poised():
    amounts = {"Fe_mol_L": [1e-4, 1e-4], "Fe_limit": ["<", ""]}
    eh, _ = convert(survey([sample(), sample()], [check(223.3)], facts=FACTS, amounts=amounts))
    assert list(eh["Eh_sd_mV"]) == pytest.approx([30, 15])


def test_failed_check_never_names_an_unknown_fill():
    # declared 1 M (236 mV), reads as 203 mV: between 3 M and saturated
    _, findings = convert(survey([sample()], [check(227.3)], facts={"electrode": "Ag/AgCl, 1 M KCl"}))
    said = next(item for item in findings if item.rule == "probe.check_failed")
    assert "fill unknown" not in said.message
    assert "Ag/AgCl, 3 M KCl" in said.message
    assert "Ag/AgCl, saturated KCl" in said.message


def test_failed_check_of_a_meter_that_already_shows_eh():
    # ZoBell 430 mV at 25 °C on the hydrogen scale
    _, findings = convert(survey([sample()], [check(430)], facts=FACTS))
    assert "already Eh" in next(item for item in findings if item.rule == "probe.check_failed").message


def test_standard_deviation_unchecked_checked_poised():
    # 60, 30, 15 mV: the settings' defaults
    plain, _ = convert(survey([sample()], facts=FACTS))
    checked, _ = convert(survey([sample()], [check(223.3)], facts=FACTS))
    poised, _ = convert(survey([sample()], [check(223.3)], facts=FACTS, amounts={"Fe_mol_L": [1e-4], "Fe_limit": [""]}))
    assert [frame.loc[0, "Eh_sd_mV"] for frame in (plain, checked, poised)] == pytest.approx([60, 30, 15])


def test_parts_of_the_standard_deviation_add_in_quadrature():
    rows = [sample(ORP_spread_mV=30.0, ORP_replicates=9.0)]
    eh, _ = convert(survey(rows, facts={"electrode": "Ag/AgCl, fill unknown"}))
    assert eh.loc[0, "Eh_sd_mV"] == pytest.approx(np.sqrt(60**2 + 10**2 + (30 / 3) ** 2))
    parts = eh.loc[0, ["Eh_sd_own_mV", "Eh_sd_common_mV"]].to_numpy(float)
    assert eh.loc[0, "Eh_sd_mV"] == pytest.approx(np.hypot(*parts))


def test_missing_temperature_is_the_median_of_the_round_else_assumed():
    rows = [
        {"ORP_mV": 0.0, "temperature_C": 9.0, "round": "1"},
        {"ORP_mV": 0.0, "temperature_C": 11.0, "round": "1"},
        {"ORP_mV": 0.0, "round": "1"},
        {"ORP_mV": 0.0, "round": "2"},
    ]
    eh, findings = convert(survey(rows, facts=FACTS))
    assert list(eh["temperature_used_C"]) == [9.0, 11.0, 10.0, 25.0]
    assert eh.loc[2, "temperature_basis"].startswith("median")
    assert eh.loc[3, "temperature_basis"] == "assumed 25 °C"
    assert findings.rules().count("probe.no_temperature") == 2
    assert eh.loc[2, "Eh_sd_mV"] > eh.loc[0, "Eh_sd_mV"]


def test_missing_temperature_keeps_to_the_unit_of_its_station():
    rows = [{"ORP_mV": 0.0, "round": "1", "station": name, "temperature_C": t} for name, t in
            (("A", 9.0), ("A", 9.4), ("B", 14.0), ("B", None))]  # fmt: skip
    stations = [{"station": "A", "aquifer": "upper"}, {"station": "B", "aquifer": "lower"}]
    eh, _ = convert(survey(rows, stations=stations, facts=FACTS))
    assert eh.loc[3, "temperature_used_C"] == 14.0
    assert eh.loc[3, "temperature_basis"] == "median of the round and unit"


def test_columns_are_those_of_the_vocabulary():
    eh, _ = convert(survey([sample()], facts=FACTS))
    assert list(eh.columns) == list(columns("eh"))
