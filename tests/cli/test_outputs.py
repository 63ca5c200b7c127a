"""Outputs go where they were asked to, whole or not at all, and never onto an input."""

from __future__ import annotations

import os
import stat
import unicodedata
from pathlib import Path

import pytest
import typer

from cli.outputs import OutputChoice, Renderers, plan_outputs
from isotherm.errors import UpstrokeError

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture
def trace(tmp_path: Path) -> Path:
    path = tmp_path / "trace.txt"
    path.write_text("area,pressure\n1,2\n")
    return path


def names(folder: Path) -> set[str]:
    return {entry.name for entry in folder.iterdir()}


def refusal(choice: OutputChoice, *inputs: Path) -> str:
    with pytest.raises(UpstrokeError) as caught:
        plan_outputs(choice, inputs)
    text = str(caught.value)
    assert "\n" not in text
    return text


def renderers(data: bytes = b"{}\n") -> Renderers:
    return Renderers(
        text=lambda: "a table\n",
        json=lambda: data,
        csv=lambda: b"a,b\n",
        figure=lambda suffix: f"a {suffix}".encode(),
    )


# ---- where an output may go


def test_the_input_itself_is_refused_even_with_force(trace: Path) -> None:
    for force in (False, True):
        text = refusal(OutputChoice(csv=trace, force=force), trace)
        assert "input" in text
        assert "never written to" in text


def test_a_symbolic_link_to_the_input_is_refused(trace: Path) -> None:
    link = trace.with_name("out.json")
    link.symlink_to(trace)
    assert "input" in refusal(OutputChoice(json=str(link), force=True), trace)


def test_a_hard_link_to_the_input_is_refused(trace: Path) -> None:
    link = trace.with_name("out.json")
    link.hardlink_to(trace)
    assert "input" in refusal(OutputChoice(json=str(link), force=True), trace)


def test_the_input_by_another_road_is_refused(trace: Path, tmp_path: Path) -> None:
    other = tmp_path / "elsewhere"
    other.symlink_to(tmp_path, target_is_directory=True)
    assert "input" in refusal(OutputChoice(csv=other / "trace.txt", force=True), trace)


def test_a_case_twin_of_the_input_is_refused(trace: Path) -> None:
    twin = trace.with_name("TRACE.TXT")
    assert "input" in refusal(OutputChoice(csv=twin, force=True), trace)


def test_a_composition_twin_of_the_input_is_refused(tmp_path: Path) -> None:
    source = tmp_path / unicodedata.normalize("NFD", "säure.csv")
    source.write_text("1,2\n")
    twin = tmp_path / unicodedata.normalize("NFC", "säure.csv")
    assert "input" in refusal(OutputChoice(csv=twin, force=True), source)


def test_a_twin_name_in_another_directory_is_allowed(trace: Path, tmp_path: Path) -> None:
    folder = tmp_path / "results"
    folder.mkdir()
    plan = plan_outputs(OutputChoice(csv=folder / "trace.txt"), [trace])
    assert plan.csv == folder / "trace.txt"


def test_an_existing_file_needs_force(trace: Path, tmp_path: Path) -> None:
    old = tmp_path / "old.csv"
    old.write_text("old")
    assert "--force" in refusal(OutputChoice(csv=old), trace)
    plan_outputs(OutputChoice(csv=old, force=True), [trace]).deliver(renderers())
    assert old.read_text() == "a,b\n"


@pytest.mark.parametrize("force", [False, True])
def test_a_directory_is_refused(trace: Path, tmp_path: Path, force: bool) -> None:
    assert "is a directory" in refusal(OutputChoice(csv=tmp_path, force=force), trace)


def test_a_device_is_refused_even_with_force(trace: Path) -> None:
    assert "not a regular file" in refusal(OutputChoice(json=os.devnull, force=True), trace)


def test_a_missing_directory_is_refused(trace: Path, tmp_path: Path) -> None:
    assert "does not exist" in refusal(OutputChoice(csv=tmp_path / "no" / "out.csv"), trace)


def test_a_file_for_a_directory_is_refused(trace: Path) -> None:
    refusal(OutputChoice(csv=trace / "out.csv"), trace)


def test_a_circle_of_links_is_refused(trace: Path, tmp_path: Path) -> None:
    (tmp_path / "a").symlink_to(tmp_path / "b")
    (tmp_path / "b").symlink_to(tmp_path / "a")
    refusal(OutputChoice(csv=tmp_path / "a"), trace)


def test_one_path_for_two_outputs_is_refused(trace: Path, tmp_path: Path) -> None:
    choice = OutputChoice(json=str(tmp_path / "out.svg"), figure=tmp_path / "OUT.svg")
    assert "same file as --json" in refusal(choice, trace)


@pytest.mark.skipif(os.geteuid() == 0, reason="the superuser may write anywhere")
def test_a_closed_directory_is_refused(trace: Path, tmp_path: Path) -> None:
    closed = tmp_path / "closed"
    closed.mkdir(mode=0o500)
    assert "closed to you" in refusal(OutputChoice(csv=closed / "out.csv"), trace)


def test_a_closed_directory_is_told_by_its_permissions(
    trace: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(os, "access", lambda *_: False)
    assert "closed to you" in refusal(OutputChoice(csv=tmp_path / "out.csv"), trace)


def test_an_unknown_figure_format_is_wrong_usage(trace: Path, tmp_path: Path) -> None:
    with pytest.raises(typer.BadParameter, match=r"\.svg, \.png, \.pdf"):
        plan_outputs(OutputChoice(figure=tmp_path / "out.bmp"), [trace])


def test_only_json_goes_to_standard_output(trace: Path) -> None:
    with pytest.raises(typer.BadParameter, match="only --json"):
        plan_outputs(OutputChoice(csv=Path("-")), [trace])


# ---- whole or not at all


def test_everything_is_written_and_the_table_printed(
    trace: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    choice = OutputChoice(
        json=str(tmp_path / "o.json"), csv=tmp_path / "o.csv", figure=tmp_path / "o.PNG"
    )
    plan_outputs(choice, [trace]).deliver(renderers())
    assert capsys.readouterr().out == "a table\n"
    assert names(tmp_path) == {"trace.txt", "o.json", "o.csv", "o.PNG"}
    assert (tmp_path / "o.PNG").read_bytes() == b"a png"
    assert trace.read_text() == "area,pressure\n1,2\n"


def test_json_on_standard_output_is_alone_there(
    trace: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    plan_outputs(OutputChoice(json="-"), [trace]).deliver(renderers(b'{"a": 1}\n'))
    assert capsys.readouterr().out == '{"a": 1}\n'


def test_new_files_have_the_usual_permissions(trace: Path, tmp_path: Path) -> None:
    usual = tmp_path / "usual"
    usual.touch()
    plan_outputs(OutputChoice(csv=tmp_path / "o.csv"), [trace]).deliver(renderers())
    assert stat.S_IMODE((tmp_path / "o.csv").stat().st_mode) == stat.S_IMODE(usual.stat().st_mode)


def test_a_replaced_file_keeps_its_permissions(trace: Path, tmp_path: Path) -> None:
    old = tmp_path / "o.csv"
    old.touch(mode=0o640)
    old.chmod(0o640)
    plan_outputs(OutputChoice(csv=old, force=True), [trace]).deliver(renderers())
    assert stat.S_IMODE(old.stat().st_mode) == 0o640


def test_a_renderer_that_fails_leaves_nothing(trace: Path, tmp_path: Path) -> None:
    def broken(suffix: str) -> bytes:
        raise UpstrokeError("cannot be drawn")

    work = Renderers(text=str, json=lambda: b"{}\n", csv=lambda: b"a\n", figure=broken)
    choice = OutputChoice(csv=tmp_path / "o.csv", figure=tmp_path / "o.svg")
    with pytest.raises(UpstrokeError, match="cannot be drawn"):
        plan_outputs(choice, [trace]).deliver(work)
    assert names(tmp_path) == {"trace.txt"}
