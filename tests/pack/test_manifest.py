"""The manifest: every file with its hash, and every later change found."""

from __future__ import annotations

import hashlib
import json

import pytest

from foredeck.errors import ReportError
from foredeck.pack.manifest import pack_files, read_manifest, verify, write_manifest
from sample_round import sample_view


@pytest.fixture
def pack(tmp_path):
    (tmp_path / "series").mkdir()
    (tmp_path / "index.html").write_text("cover", encoding="utf-8")
    (tmp_path / "series" / "b.html").write_bytes(b"b")
    (tmp_path / "series" / "ä.html").write_bytes(b"")
    write_manifest(tmp_path, sample_view(), revision=3)
    return tmp_path


def test_it_names_round_revision_makers_and_every_file(pack):
    content = read_manifest(pack)
    assert (content["round"], content["revision"], content["state"]) == ("2026-10", 3, "issued")
    assert content["made"]["versions"] == {"foredeck": "0.1.0", "python": "3.11"}
    assert content["made"]["settings_fingerprint"] == "7c1e44a0b93f"
    assert [entry["path"] for entry in content["files"]] == ["index.html", "series/b.html", "series/ä.html"]
    digest = hashlib.sha256(b"cover").hexdigest()
    assert content["files"][0] == {"path": "index.html", "sha256": digest, "bytes": 5}


def test_the_table_of_files_equals_the_manifest(pack):
    assert pack_files(pack).to_dict("records") == read_manifest(pack)["files"]


def test_a_pack_as_written_has_no_differences(pack):
    assert verify(pack) == []


def test_every_kind_of_change_is_found(pack):
    (pack / "index.html").write_text("covER", encoding="utf-8")
    (pack / "series" / "b.html").write_bytes(b"longer")
    (pack / "series" / "ä.html").unlink()
    (pack / "new.txt").write_bytes(b"")
    assert verify(pack) == ["index.html was changed: its SHA-256 differs", "new.txt is not in the manifest",
                            "series/b.html has 6 bytes, the manifest says 1", "series/ä.html is missing"]


def test_a_file_that_became_a_link_is_found(pack):
    (pack / "index.html").unlink()
    (pack / "index.html").symlink_to(pack / "series" / "b.html")
    assert verify(pack) == ["index.html is a link, not a file"]


def test_a_pack_with_a_link_is_refused(pack):
    (pack / "away").symlink_to("/etc/hostname")
    with pytest.raises(ReportError) as caught:
        write_manifest(pack, sample_view(), revision=1)
    assert str(caught.value) == (f"the pack holds a link: away\n  where: {pack}\n"
                                 "  allowed: files and folders\n"
                                 "  next: put the file itself in its place")


def test_a_folder_without_manifest_is_refused(tmp_path):
    with pytest.raises(ReportError) as caught:
        verify(tmp_path)
    assert str(caught.value) == (f"the folder holds no manifest\n  where: {tmp_path / 'manifest.json'}\n"
                                 "  allowed: a pack made by foredeck\n"
                                 "  next: give the folder of a pack, or render the round again")


@pytest.mark.parametrize("text", ["", "{", "[]", "{}", '{"files": [{"path": "a"}]}', '{"files": 3}'])
def test_a_broken_manifest_is_refused(pack, text):
    (pack / "manifest.json").write_text(text, encoding="utf-8")
    with pytest.raises(ReportError, match="the manifest cannot be read"):
        verify(pack)


@pytest.mark.parametrize("path", ["../secret", "/etc/passwd", "series/../../x"])
def test_a_manifest_that_names_files_outside_is_refused(pack, path):
    entry = {"path": path, "sha256": "0" * 64, "bytes": 0}
    (pack / "manifest.json").write_text(json.dumps({"files": [entry]}), encoding="utf-8")
    with pytest.raises(ReportError) as caught:
        verify(pack)
    assert str(caught.value) == (f"the manifest names a file outside the pack: {path!r}\n"
                                 f"  where: {pack / 'manifest.json'}\n  allowed: paths inside the folder\n"
                                 "  next: do not trust this pack; render the round again")


def test_the_same_pack_gives_the_same_manifest(pack):
    first = (pack / "manifest.json").read_bytes()
    write_manifest(pack, sample_view(), revision=3)
    assert (pack / "manifest.json").read_bytes() == first
