"""The ladder of a mode; what its degrees do is common practice and stands in the pack with its sources."""

from melodycoach.core.ladder import ladder
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")


def test_the_rungs_rise_and_name_what_the_leading_degrees_do() -> None:
    rungs = ladder(PACK.find("huseyni"), 0, PACK.names)
    heights = [rung.height for rung in rungs]
    assert heights == sorted(set(heights))
    does = {rung.name: (rung.function, rung.role) for rung in rungs}
    assert does["dügâh"] == ("karar", "final")
    assert does["hüseynî"] == ("güçlü", "dominant")
    assert does["rast"] == ("yeden", "degree")
    assert does["muhayyer"] == ("", "degree")  # the octave of the karar is no karar


def test_a_mode_that_stands_elsewhere_gets_the_names_of_that_place() -> None:
    rungs = ladder(PACK.find("huseyni"), -31, PACK.names)
    assert next(rung.name for rung in rungs if rung.role == "final") == "yegâh"


def test_passing_colours_get_no_rung() -> None:
    mode = PACK.find("humayun")
    assert mode.passing
    assert not {rung.height for rung in ladder(mode, 0, PACK.names)} & set(mode.passing)
