"""Records come back as they were kept; what is damaged, half-written or unknown is refused by name."""

import json
import os
import subprocess
import sys
from dataclasses import fields, is_dataclass, replace
from pathlib import Path

import numpy as np
import pytest

from fem.errors import StoreError
from fem.results import store


def same(a: object, b: object, *, rtol: float = 0.0) -> None:
    """Compare two parts of a record value by value; NaN equals NaN."""
    assert type(a) is type(b), (a, b)
    if is_dataclass(a):
        for field in fields(a):
            # Temperature frames are kept in single precision: half a unit in its last place is 2**-24 of the value.
            loose = 2.0**-24 if type(a).__name__ == "Fields" and field.name == "T" else 0.0
            same(getattr(a, field.name), getattr(b, field.name), rtol=loose)
    elif isinstance(a, np.ndarray):
        assert a.dtype == b.dtype
        np.testing.assert_allclose(a, b, rtol=rtol, atol=0.0, equal_nan=True)
    elif isinstance(a, tuple | list):
        assert len(a) == len(b)
        for x, y in zip(a, b, strict=True):
            same(x, y)
    elif isinstance(a, dict):
        assert a.keys() == b.keys()
        for key in a:
            same(a[key], b[key])
    elif isinstance(a, float):
        assert a == b or (np.isnan(a) and np.isnan(b))
    else:
        assert a == b


@pytest.mark.parametrize("which", ["record", "quick"])
def test_record_comes_back_as_it_was_kept(which, request, tmp_path):
    record = request.getfixturevalue(which)
    same(store.load(store.save(record, tmp_path / "deep" / "one")), record)


def test_comparison_sees_a_changed_number(record, tmp_path):
    kept = store.load(store.save(record, tmp_path / "one"))
    with pytest.raises(AssertionError):
        same(replace(kept, seconds=kept.seconds + 1e-9), record)
    with pytest.raises(AssertionError):
        same(replace(kept, figures=replace(kept.figures, value=kept.figures.value + 1e-9)), record)


def test_json_is_strict_and_states_what_is_not_finite(record, tmp_path):
    def refuse(word):
        raise AssertionError(f"{word} is not JSON")

    known = json.loads((store.save(record, tmp_path / "one") / "record.json").read_text(), parse_constant=refuse)
    assert known["verdicts"][1]["crossing"][2] == "Infinity"
    assert known["facts"]["widest"] == {"not finite": "inf"}
    assert known["format"] == 1


def test_nothing_is_pickled(record, tmp_path):
    folder = store.save(record, tmp_path / "one")
    for path in folder.glob("*.npz"):
        with np.load(path, allow_pickle=False) as file:
            assert all(file[name].dtype.kind in "fib" for name in file.files)
    with pytest.raises(TypeError, match="object"):
        store.save(replace(record, fields=replace(record.fields, doubt=np.array([{}], dtype=object))), tmp_path / "two")
    assert not (tmp_path / "two").exists()


def test_sums_can_be_checked_without_this_program(record, tmp_path):
    folder = store.save(record, tmp_path / "one")
    run = subprocess.run(["sha256sum", "-c", "SHA256SUMS"], cwd=folder, capture_output=True, text=True, check=False)
    assert run.returncode == 0
    assert run.stdout.count(": OK") == 5


def test_unknown_format_is_refused(record, tmp_path):
    folder = store.save(record, tmp_path / "one")
    head = json.loads((folder / "record.json").read_text())
    (folder / "record.json").write_text(json.dumps(head | {"format": 99}))
    with pytest.raises(StoreError, match="format 99; this program reads format 1"):
        store.load(folder)


@pytest.mark.parametrize("name", ["record.json", "figures.npz", "mesh.npz", "fields.npz", "docket.toml", "SHA256SUMS"])
@pytest.mark.parametrize("harm", ["gone", "cut", "flipped"])
def test_damage_is_refused(record, tmp_path, name, harm):
    folder = store.save(record, tmp_path / "one")
    path = folder / name
    content = path.read_bytes()
    if harm == "gone":
        path.unlink()
    elif harm == "cut":
        path.write_bytes(content[: len(content) // 2])
    else:
        middle = len(content) // 2
        path.write_bytes(content[:middle] + bytes([content[middle] ^ 1]) + content[middle + 1 :])
    with pytest.raises(StoreError, match="one"):
        store.load(folder)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "cannot be read"),
        ("[]", "no format number"),
        ("{}", "no format number"),
        ('{"format": 1}', "versions"),
        ("{", "cannot be read"),
    ],
)
def test_head_that_is_no_head_is_refused(record, tmp_path, text, says):
    folder = store.save(record, tmp_path / "one")
    (folder / "record.json").write_text(text)
    with pytest.raises(StoreError, match=says):
        store.load(folder)


def test_arrays_that_do_not_fit_are_refused(record, tmp_path):
    """Sums that agree do not make a record: a folder written by other hands is refused too."""
    folder = store.save(record, tmp_path / "one")
    np.savez(folder / "mesh.npz", points=np.zeros((2, 2)), facet_label=np.array([7]))
    lines = (folder / "SHA256SUMS").read_text().splitlines()
    mended = [f"{store._sum(folder / 'mesh.npz')}  mesh.npz" if line.endswith("mesh.npz") else line for line in lines]
    (folder / "SHA256SUMS").write_text("\n".join(mended) + "\n")
    with pytest.raises(StoreError, match="no whole record"):
        store.load(folder)


class Trap:
    """Unpickling it makes a folder: code of whoever wrote the file would have run."""

    def __init__(self, made):
        self.made = made

    def __reduce__(self):
        return os.mkdir, (str(self.made),)


def test_pickled_array_is_refused_and_never_opened(record, tmp_path):
    folder = store.save(record, tmp_path / "one")
    with np.load(folder / "fields.npz") as file:
        arrays = dict(file)
    arrays["doubt"] = np.array([Trap(tmp_path / "sprung")], dtype=object)
    np.savez(folder / "fields.npz", **arrays)
    lines = (folder / "SHA256SUMS").read_text().splitlines()
    mended = [f"{store._sum(folder / 'fields.npz')}  fields.npz" if "fields.npz" in line else line for line in lines]
    (folder / "SHA256SUMS").write_text("\n".join(mended) + "\n")
    with pytest.raises(StoreError, match="no whole record"):
        store.load(folder)
    assert not (tmp_path / "sprung").exists()


def test_no_record_is_said_so(tmp_path):
    with pytest.raises(StoreError, match="holds no record"):
        store.load(tmp_path / "nothing")


def test_writing_that_breaks_off_leaves_the_old_record_and_nothing_else(record, tmp_path, monkeypatch):
    folder = store.save(record, tmp_path / "one")

    def full(*_, **__):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(np, "savez_compressed", full)
    with pytest.raises(StoreError, match="No space left"):
        store.save(replace(record, title="new"), folder)
    assert store.load(folder).title == record.title
    assert [path.name for path in tmp_path.iterdir()] == ["one"]


def test_abort_while_writing_leaves_nothing(record, tmp_path, monkeypatch):
    def abort(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr(np, "savez_compressed", abort)
    with pytest.raises(KeyboardInterrupt):
        store.save(record, tmp_path / "one")
    assert not list(tmp_path.iterdir())


def test_saving_again_replaces(record, tmp_path):
    store.save(record, tmp_path / "one")
    store.save(replace(record, title="new"), tmp_path / "one")
    assert store.load(tmp_path / "one").title == "new"
    assert [path.name for path in tmp_path.iterdir()] == ["one"]


def test_shelf_that_cannot_be_written_is_said_so(record, tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(StoreError, match="could not be written"):
        store.save(record, tmp_path / "file" / "one")


def test_shelf_answers_its_own_hash_and_kind_only(record, tmp_path):
    shelf = store.shelf_of(tmp_path / "deck.docket.toml")
    assert shelf == tmp_path / "deck.records"
    assert store.find(shelf, record.content_hash, "vouch") is None
    folder = store.save(record, store.place_on(shelf, record.content_hash, record.kind))
    assert folder.name == "vouch-" + record.content_hash[:12]
    assert store.find(shelf, record.content_hash, "vouch") == folder
    assert store.find(shelf, record.content_hash, "quick look") is None
    same_start = record.content_hash[:12] + "0" * 52
    assert store.find(shelf, same_start, "vouch") is None


def test_interrupted_record_answers_nothing_and_takes_no_place(record, tmp_path):
    broken_off = replace(record, outcome="interrupted")
    folder = store.place_on(tmp_path, record.content_hash, "vouch", "interrupted")
    store.save(broken_off, folder)
    assert store.find(tmp_path, record.content_hash, "vouch") is None
    done = store.save(record, store.place_on(tmp_path, record.content_hash, "vouch"))
    assert done != folder
    assert store.find(tmp_path, record.content_hash, "vouch") == done
    store.save(broken_off, done)
    assert store.find(tmp_path, record.content_hash, "vouch") is None


def test_record_with_callables_is_never_found(record, tmp_path):
    store.save(replace(record, shelvable=False), store.place_on(tmp_path, record.content_hash, "vouch"))
    assert store.find(tmp_path, record.content_hash, "vouch") is None


def test_damaged_record_on_the_shelf_is_said_so(record, tmp_path):
    folder = store.save(record, store.place_on(tmp_path, record.content_hash, "vouch"))
    (folder / "record.json").write_text("{")
    with pytest.raises(StoreError, match="cannot be read"):
        store.find(tmp_path, record.content_hash, "vouch")


def test_readers_never_load_the_solver():
    """In a process of its own: what tests have imported before must not count."""
    code = (
        "import sys, fem.results.record, fem.results.store, fem.export.write, fem.results.numbers\n"
        "solver = tuple(f'fem.{name}' for name in 'solve runs checks earn mesh vouch'.split())\n"
        "loaded = [name for name in sys.modules if name.startswith(solver)]\n"
        "print(loaded, 'skfem' in sys.modules, 'gmsh' in sys.modules)"
    )
    root = Path(store.__file__).parents[2]
    run = subprocess.run([sys.executable, "-c", code], cwd=root, capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "[] False False"
