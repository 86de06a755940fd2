"""The command: what it makes, what it refuses and why; nothing half-made is left, whatever happens."""

from __future__ import annotations

import errno
import json
import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

import render.output.page as page_module
from render.command import main
from render.command_page import default_target
from render.errors import LatepullError, MachineError, OutputExists
from render.output.page import INDEX, MANIFEST, PageScene, find_extras, stands, write_page, write_single
from render.output.page_films import Pictures, make_pictures, page_range, page_shot, study_key
from render.output.page_pdf import write_pdf
from render.study_io import save_study
from scenes.reader import read_scene, scene_text
from tests.output.made_up import made_up_study

SCENE = "healthy_loop"


@pytest.fixture
def command(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, scenes: list[PageScene], capsys: pytest.CaptureFixture[str]
) -> Callable[..., tuple[int, str, str]]:
    """Run the command in an empty folder that holds a saved study of a shipped scene; pictures are drawn before."""
    monkeypatch.chdir(tmp_path)
    study = replace(made_up_study(fault=False), scene=read_scene(SCENE), scene_text=scene_text(SCENE))
    save_study(study, tmp_path / "out" / SCENE)
    drawn: list[str] = []

    def pictures(study: Any, slot: str, folder: Path, **options: Any) -> Pictures:
        drawn.append(str(folder))
        return scenes[1].pictures

    monkeypatch.setattr("render.output.page_films.make_pictures", pictures)

    def run(*words: str) -> tuple[int, str, str]:
        drawn.clear()
        code = main(["page", *words])
        said = capsys.readouterr()
        return code, said.out, said.err

    run.drawn = drawn  # type: ignore[attr-defined]
    return run


def everything(folder: Path) -> list[str]:
    return sorted(p.relative_to(folder).as_posix() for p in folder.rglob("*") if p.is_file())


def test_a_page_a_single_file_and_paper(pango: None, command: Any, tmp_path: Path) -> None:
    code, out, _ = command(SCENE, "--pdf", "--json")
    said = json.loads(out)
    assert (code, said["page"], said["scenes"]) == (0, f"out/{SCENE}/page/index.html", 1)
    assert said["pdf"] == f"out/{SCENE}/page/briefing.pdf" and Path(said["pdf"]).read_bytes()[:5] == b"%PDF-"
    assert "training illustration" in said["caution"]
    code, out, _ = command(SCENE, "--single", "--pdf", "--out", "für den 'Raum' 1.html")
    assert code == 0 and "1 scene" in out
    assert Path("für den 'Raum' 1.html").stat().st_size > 100_000 and Path("für den 'Raum' 1.pdf").is_file()
    assert [p.name for p in tmp_path.iterdir() if p.name.startswith(".")] == []


def test_a_page_that_is_there_is_kept(command: Any) -> None:
    assert command(SCENE)[0] == 0
    before = Path(f"out/{SCENE}/page/index.html").stat().st_mtime_ns
    code, _, err = command(SCENE)
    assert code == 2 and "already there" in err and command.drawn == []  # refused before any work
    assert Path(f"out/{SCENE}/page/index.html").stat().st_mtime_ns == before
    assert command(SCENE, "--force")[0] == 0


def test_a_folder_that_is_no_page_is_left_alone(command: Any, tmp_path: Path) -> None:
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine/letter.txt").write_text("keep me", encoding="utf-8")
    code, _, err = command(SCENE, "--out", "mine", "--force")
    assert code == 2 and "holds no page; it is left as it is" in err
    assert everything(tmp_path / "mine") == ["letter.txt"]


@pytest.mark.parametrize(("spoil", "words"), [
    ("scene", "was edited since the study"),
    ("version", "was flown by latepull 0.0.1, this is"),
    ("format", "was saved in format 0"),
    ("arrays", "does not belong to"),
])  # fmt: skip
def test_a_study_that_does_not_fit_is_named_and_refused(command: Any, tmp_path: Path, spoil: str, words: str) -> None:
    folder = tmp_path / "out" / SCENE
    data = json.loads((folder / "study.json").read_text(encoding="utf-8"))
    if spoil == "scene":
        study = replace(made_up_study(fault=False), scene=read_scene(SCENE), scene_text="title: as it was\n")
        save_study(study, folder)
    elif spoil == "version":
        data["study"]["versions"]["map"]["latepull"] = "0.0.1"
        (folder / "study.json").write_text(json.dumps(data), encoding="utf-8")
    elif spoil == "format":
        (folder / "study.json").write_text(json.dumps({**data, "format": 0}), encoding="utf-8")
    else:
        (folder / "study.npz").write_bytes(b"PK")
    code, _, err = command(SCENE)
    assert code == 2 and words in err and "--again" in err and "Traceback" not in err
    assert not (folder / "page").exists() and command.drawn == []


def test_again_flies_and_replaces(command: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    assert command(SCENE)[0] == 0
    flown: list[str] = []
    made = replace(made_up_study(fault=False), scene=read_scene(SCENE), scene_text=scene_text(SCENE))
    monkeypatch.setattr("render.command_page._flown", lambda name, scene: flown.append(name) or made)
    (tmp_path / "out" / SCENE / "study.npz").write_bytes(b"PK")
    assert command(SCENE, "--again")[0] == 0
    assert flown == [SCENE]


def test_all_faults_of_all_scenes_at_once(command: Any, tmp_path: Path) -> None:
    for name in ("eins", "zwei"):
        (tmp_path / f"{name}.yaml").write_text(f"like: {SCENE}\nflor: 10 ft\n", encoding="utf-8")
    code, _, err = command("eins.yaml", "zwei.yaml", SCENE)
    assert code == 2 and "eins.yaml:2" in err and "zwei.yaml:2" in err
    (tmp_path / "a").mkdir()
    (tmp_path / f"a/{SCENE}.yaml").write_text(f"like: {SCENE}\n", encoding="utf-8")
    code, _, err = command(SCENE, f"a/{SCENE}.yaml")
    assert code == 2 and f"two scenes are named {SCENE}" in err
    code, _, err = command(SCENE, "--slot", "nowhere")
    assert code == 2 and "--slot: read nowhere" in err


def test_where_pages_go() -> None:
    assert default_target(["a"], False) == Path("out/a/page")
    assert default_target(["a", "b"], True) == Path("out/page.html")


class TestNoHalfPage:
    """A page stands whole or not at all, and an old one stands until the new one is whole."""

    def full(self, *_: object, **__: object) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    def test_full_disk(self, scenes: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        write_page(scenes[:1], tmp_path / "page", made="first")
        before = (tmp_path / "page" / INDEX).read_bytes()
        monkeypatch.setattr(shutil, "copyfile", self.full)
        with pytest.raises(MachineError, match="full"):
            write_page(scenes, tmp_path / "page", made="second", force=True)
        with pytest.raises(MachineError, match="full"):
            write_page(scenes, tmp_path / "new", made="second")
        assert (tmp_path / "page" / INDEX).read_bytes() == before
        assert [p.name for p in tmp_path.iterdir()] == ["page"]

    def test_full_disk_single(self, scenes: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.setattr(page_module, "render_page", self.full)
        with pytest.raises(MachineError, match="full"):
            write_single(scenes, tmp_path / "page.html", made="now", pdf=tmp_path / "page.pdf")
        assert list(tmp_path.iterdir()) == []

    def test_no_pdf_no_page(self, scenes: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        def fails(*_: object, **__: object) -> None:
            raise MachineError("the PDF needs Pango")

        monkeypatch.setattr(page_module, "write_pdf", fails)
        with pytest.raises(MachineError, match="Pango"):
            write_page(scenes, tmp_path / "page", made="now", pdf=True)
        assert list(tmp_path.iterdir()) == []

    def test_the_old_page_comes_back(self, scenes: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        write_page(scenes[:1], tmp_path / "page", made="first")
        real, moves = page_module.os.replace, []

        def second_fails(source: Any, target: Any) -> None:
            moves.append(target)
            if len(moves) == 2:
                raise OSError(errno.EACCES, "Permission denied")
            real(source, target)

        monkeypatch.setattr(page_module.os, "replace", second_fails)
        with pytest.raises(MachineError, match="may not write"):
            write_page(scenes, tmp_path / "page", made="second", force=True)
        assert "first" in (tmp_path / "page" / INDEX).read_text(encoding="utf-8")

    def test_no_permission(self, scenes: Any, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
        monkeypatch.setattr("os.access", lambda *_: False)  # the tests may run as root, who may write anywhere
        with pytest.raises(MachineError, match="no permission"):
            write_page(scenes, tmp_path / "page", made="now")
        assert list(tmp_path.iterdir()) == []


def with_pictures(folder: Path, *pictures: str) -> Path:
    """A little page with these pictures in the folder of a page."""
    page = folder / "little.html"
    page.write_text("".join(f'<img src="{picture}">' for picture in pictures), encoding="utf-8")
    return page


def test_a_page_that_lost_a_file_is_named(pango: None, scenes: Any, page_folder: Path, tmp_path: Path) -> None:
    folder = tmp_path / "copy"
    shutil.copytree(page_folder, folder)
    assert stands(scenes, folder) and not stands(scenes[:1], folder)
    (folder / "files/scene1_still1.jpg").unlink()
    with pytest.raises(LatepullError, match=r"files/scene1_still1\.jpg missing or changed"):
        stands(scenes, folder)
    with pytest.raises(LatepullError, match=r"scene1_still1\.jpg missing"):
        write_pdf(with_pictures(folder, "files/scene1_still1.jpg", "files/scene1_still2.jpg"), tmp_path / "x.pdf")
    assert not (tmp_path / "x.pdf").exists()
    (folder / MANIFEST).write_text("{", encoding="utf-8")
    assert not stands(scenes, folder)


def test_the_pdf_reads_nothing_else(pango: None, page_folder: Path, tmp_path: Path) -> None:
    folder = tmp_path / "copy"
    shutil.copytree(page_folder, folder)
    page = with_pictures(folder, "files/scene1_still1.jpg", "file:///etc/hostname", "http://127.0.0.2:9/x")
    with pytest.raises(LatepullError, match="whole: hostname, x missing"):
        write_pdf(page, tmp_path / "x.pdf")
    assert write_pdf(with_pictures(folder, "files/scene1_still1.jpg"), tmp_path / "x.pdf").read_bytes()[:5] == b"%PDF-"


def test_pictures_are_kept_and_drawn_again_for_another_flight(scenes: Any, tmp_path: Path) -> None:
    made = scenes[0].pictures
    study = scenes[0].study
    folder = tmp_path / "kept"
    shutil.copytree(made.annotated.parent, folder)
    from tests.page.conftest import numbered

    def draw(of: Any) -> Pictures:
        return make_pictures(of, "right", folder, shot=made.shot, source=numbered(made.shot))

    before = (folder / "right.mp4").stat().st_mtime_ns
    draw(study)
    assert (folder / "right.mp4").stat().st_mtime_ns == before
    other = replace(study, scene_text="another")
    assert study_key(other) != study_key(study)
    draw(other)
    assert (folder / "right.mp4").stat().st_mtime_ns != before
    before = (folder / "right.mp4").stat().st_mtime_ns
    (folder / "right_plain.mp4").unlink()  # a missing film is drawn again, not left out
    draw(other)
    assert (folder / "right_plain.mp4").is_file() and (folder / "right.mp4").stat().st_mtime_ns != before


def test_the_film_runs_until_the_last_observer_has_acted() -> None:
    study = made_up_study()
    start, end = page_range(study, "right")
    acts = [n.time_s + n.reaction_s for n in study.notices["right"] if n.time_s is not None]
    assert start < study.faulted.fault_s and end >= min(max(acts), study.faulted.contact_s[1])
    shot = page_shot(study, "right")
    assert not any(shot.caption)  # a hold or slow motion would give the moment away in the plain film


def test_maps_and_cards_are_taken_if_they_can_be_read(tmp_path: Path) -> None:
    from PIL import Image

    Image.new("RGB", (8, 8)).save(tmp_path / "gate_card.png")
    Image.new("RGB", (8, 8)).save(tmp_path / "map.png")
    (tmp_path / "map.svg").write_text("<svg xmlns='http://www.w3.org/2000/svg'/>", encoding="utf-8")
    (tmp_path / "map_broken.png").write_bytes(b"\x89PNG no")
    (tmp_path / "scatter.svg").write_text("not a drawing", encoding="utf-8")
    (tmp_path / "map_empty.png").touch()
    assert [p.name for p in find_extras(tmp_path)] == ["map.svg", "gate_card.png"]
    assert find_extras(tmp_path / "none") == ()


def test_a_page_that_is_there_may_not_be_overwritten(scenes: Any, page_folder: Path) -> None:
    with pytest.raises(OutputExists):
        write_page(scenes, page_folder, made="now")


def test_a_map_is_found_in_its_own_folder(tmp_path: Path) -> None:
    (tmp_path / "map").mkdir()
    (tmp_path / "map" / "map.svg").write_text('<svg xmlns="http://www.w3.org/2000/svg"/>', encoding="utf-8")
    assert find_extras(tmp_path) == (tmp_path / "map" / "map.svg",)
