from profiles.ingest.wording import listed, nearest, printable


def test_the_nearest_name_is_proposed_whatever_its_case():
    assert nearest("temprature", ["Temperature", "depth"]) == "; did you mean 'Temperature'?"
    assert nearest("xyz", ["Temperature"]) == ""


def test_long_lists_are_cut_and_counted():
    assert listed("abcde", most=2) == "'a', 'b' and 3 more"


def test_rows_are_made_fit_to_print():
    raw = b"a\x00b\xffc\td".decode("utf-8", "surrogateescape")
    assert printable(raw) == "a\\x00b\\xffc\td"
    assert len(printable("\x00" * 500)) == 200
    assert printable("20 °C") == "20 °C"


def test_long_names_are_cut():
    assert len(listed(["x" * 1_000_000])) < 100
