"""Files and folders appear whole or not at all."""

import pytest

from fem.atomic import whole_file, whole_folder


def break_off(writing, error):
    """Write a part, then fail."""
    with writing as draft:
        (draft / "two" if draft.is_dir() else draft).write_text("half")
        raise error


def test_file_is_replaced_whole(tmp_path):
    target = tmp_path / "a.txt"
    target.write_text("old")
    with whole_file(target) as draft:
        draft.write_text("new")
        assert target.read_text() == "old"
    assert target.read_text() == "new"
    assert [path.name for path in tmp_path.iterdir()] == ["a.txt"]


@pytest.mark.parametrize("ends", [ValueError, KeyboardInterrupt])
def test_file_that_breaks_off_leaves_the_old_one(tmp_path, ends):
    target = tmp_path / "a.txt"
    target.write_text("old")
    with pytest.raises(ends):
        break_off(whole_file(target), ends)
    assert target.read_text() == "old"
    assert [path.name for path in tmp_path.iterdir()] == ["a.txt"]


def test_folder_is_replaced_with_nothing_of_the_old(tmp_path):
    target = tmp_path / "a"
    for name in ("one", "two"):
        with whole_folder(target) as draft:
            (draft / name).write_text(name)
    assert [path.name for path in target.iterdir()] == ["two"]
    assert [path.name for path in tmp_path.iterdir()] == ["a"]


@pytest.mark.parametrize("ends", [ValueError, KeyboardInterrupt])
def test_folder_that_breaks_off_leaves_the_old_one(tmp_path, ends):
    target = tmp_path / "a"
    with whole_folder(target) as draft:
        (draft / "one").write_text("one")
    with pytest.raises(ends):
        break_off(whole_folder(target), ends)
    assert [path.name for path in target.iterdir()] == ["one"]
    assert [path.name for path in tmp_path.iterdir()] == ["a"]


def test_folder_whose_place_is_taken_meanwhile_is_put_back(tmp_path, monkeypatch):
    """The last rename fails: the older folder returns to its place."""
    target = tmp_path / "a"
    with whole_folder(target) as draft:
        (draft / "one").write_text("one")
    real = type(target).replace

    def replace(self, there):
        if there == target and not (self / "one").exists():
            raise OSError(39, "Directory not empty")
        return real(self, there)

    monkeypatch.setattr(type(target), "replace", replace)
    with pytest.raises(OSError, match="not empty"), whole_folder(target) as draft:
        (draft / "two").write_text("two")
    assert [path.name for path in target.iterdir()] == ["one"]
    assert [path.name for path in tmp_path.iterdir()] == ["a"]
