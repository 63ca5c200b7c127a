"""A slice of the evidence scores with floors well below the quoted figures."""

from evidence_score import score as score_sets
from evidence_wave_score import score as score_waves


def test_bad_kinds_are_named_and_good_sets_left_alone():
    found = score_sets("tune", 40)
    # report half, 800 sets: false alarms 3.3 %, named 97.4 %, truth inside 2u 94.5 %;
    # the floors are three standard errors of 40 sets below
    assert found["false_alarm_rate"] <= 0.15
    assert found["named_all"] >= 0.85
    assert found["layers_inside_2u"] >= 0.80


def test_charges_of_waves():
    found = score_waves("tune", 25)
    # report half, 400 records: median error 0.7 %, truth inside 2u 95.3 %, none missed or invented
    assert found["median_error"] < 0.02
    assert found["inside_2u"] >= 0.85
    assert found["missed"] < 0.05
    assert found["invented"] < 0.05
