"""A foreign package of a name like ours is noticed before anything is run."""

import os
import subprocess
import sys
from pathlib import Path

import service

HOME = Path(service.__file__).parent.parent


def test_a_foreign_config_in_the_folder_is_noticed_and_not_run(tmp_path: Path) -> None:
    foreign = tmp_path / "config"
    foreign.mkdir()
    (foreign / "__init__.py").write_text(
        "raise RuntimeError('the foreign package was run')\n", encoding="utf-8"
    )
    # `python -m` puts the folder one stands in before all others.
    done = subprocess.run(
        [sys.executable, "-m", "service.cli.main", "streams"],
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(HOME)},
        capture_output=True,
        text=True,
        timeout=60,
    )
    assert done.returncode == 1
    assert "not knickpoint's" in done.stderr
    assert "Traceback" not in done.stderr
