from wavegen.meters import statistic_names as names


def test_no_two_statistics_share_a_name():
    every = {names.INSTANTANEOUS, names.PER_SYMBOL, names.PASSBAND, names.SENSOR}
    assert len(every) == 4
    assert "symbol" not in names.INSTANTANEOUS
    assert "instantaneous" not in names.PER_SYMBOL


def test_the_gate_is_part_of_the_name():
    assert names.gated_name(names.SENSOR, "whole record").endswith("(whole record)")
