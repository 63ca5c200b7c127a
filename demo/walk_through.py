"""Renew what the commands print in demo/README.md, and the picture of the project's README.

Every `console` block of the walk-through starts with `$ upstroke ...`; the rest is what that command prints.

    python demo/walk_through.py            renew
    python demo/walk_through.py --check    say what is stale, and exit with 1 if anything is
"""

from __future__ import annotations

import contextlib
import io
import os
import re
import shlex
import sys
import tempfile
from pathlib import Path

HERE = Path(__file__).resolve().parent
PAGE = HERE / "README.md"
PICTURE = HERE / "spacer_isotherm.svg"
BLOCK = re.compile(r"```console\n\$ (upstroke [^\n]*(?:\\\n[^\n]*)*)\n(.*?)```", re.S)
WIDTH = "80"


def printed(command: str) -> str:
    """Return what one command line prints, with its exit status where that is not 0."""
    from cli.main import run

    words = shlex.split(command.replace("\\\n", " "))[1:]
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        status = run(words)
    said = out.getvalue() + err.getvalue()
    return said if status == 0 else f"{said}(exit status {status})\n"


def renewed(page: str) -> str:
    """Return the walk-through with every block as its command prints it now.

    The commands run one after another in one passing folder, where `demo` is this folder.
    """
    before, width = Path.cwd(), os.environ.get("COLUMNS")
    with tempfile.TemporaryDirectory() as work:
        (Path(work) / "demo").symlink_to(HERE)
        os.chdir(work)
        os.environ["COLUMNS"] = WIDTH
        try:
            return BLOCK.sub(lambda m: f"```console\n$ {m[1]}\n{printed(m[1])}```", page)
        finally:
            os.chdir(before)
            if width is None:
                del os.environ["COLUMNS"]
            else:
                os.environ["COLUMNS"] = width


def picture() -> bytes:
    """Return the figure of the first isotherm."""
    with tempfile.TemporaryDirectory() as work:
        path = Path(work) / "figure.svg"
        names = [str(HERE / name) for name in ("spacer_isotherm.txt", "spacer.toml")]
        printed(
            shlex.join(["upstroke", "isotherm", names[0], "-s", names[1], "--figure", str(path)])
        )
        return path.read_bytes()


def main(arguments: list[str]) -> int:
    """Renew or check."""
    sys.path.insert(0, str(HERE.parent))
    for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ[name] = "1"  # as `upstroke` itself does: one order of additions
    old = PAGE.read_text(encoding="utf-8")
    new = renewed(old)
    if "--check" in arguments:
        stale = [command for (command, text), (_, now) in zip(
            BLOCK.findall(old), BLOCK.findall(new), strict=True) if text != now]  # fmt: skip
        for command in stale:
            print(f"stale: {command}")
        return 1 if stale else 0
    PAGE.write_text(new, encoding="utf-8")
    PICTURE.write_bytes(picture())
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
