"""The evidence file to fill in is one the reader takes."""

import re

from transfer.evidence_kinds import COMMON, KINDS
from transfer.evidence_read import read_evidence
from transfer.evidence_template import evidence_template


def test_every_kind_and_setting_reads_back(tmp_path):
    head, *sections = re.split(r"(?m)^\n?(?=# \[)", evidence_template())
    assert head.startswith("# Evidence")
    text = "\n".join(line[2:] for part in sections for line in part.splitlines() if line)
    path = tmp_path / "e.toml"
    path.write_text(text, encoding="utf-8")
    found = read_evidence(path)
    assert [s.kind for s in found.series] == list(KINDS)
    for series in found.series:
        own = {key.name for key in KINDS[series.kind].keys} - {key.name for key in COMMON}
        assert own == set(series.settings), series.kind


def test_what_every_kind_takes_is_said_once():
    for key in COMMON:
        assert evidence_template().count(f"{key.name} = ") == 1


def test_left_as_it_is_it_holds_no_evidence():
    assert all(not line or line.startswith("#") for line in evidence_template().splitlines())
    assert max(map(len, evidence_template().splitlines())) <= 110
