from planner.writing import file_names


def test_no_two_titles_share_a_file_and_no_name_leaves_the_folder():
    titles = ["example a/b", "example a-b", "example A-B", "../x", "Ω-☃", "é", "…", "grid NGC 1+2"]
    names = file_names(titles)
    assert list(names) == titles
    assert len({name.casefold() for name in names.values()}) == len(titles)
    assert not any("/" in name or name.startswith(".") for name in names.values())
    assert names["example a/b"] == "example-a-b"
    assert names["é"] == "é"
