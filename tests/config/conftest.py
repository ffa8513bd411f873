"""Settings files of an invented house, written to a folder of their own."""

from collections.abc import Callable, Mapping
from pathlib import Path

import pytest

from config.errors import SettingsFaults
from config.loading import load_settings
from config.settings import Settings

Load = Callable[..., Settings]
Faults = Callable[..., list[str]]


@pytest.fixture
def load(tmp_path: Path) -> Load:
    """Load a file with this text."""

    def loaded(text: str, environ: Mapping[str, str] | None = None) -> Settings:
        path = tmp_path / "knickpoint.toml"
        path.write_text(text, encoding="utf-8")
        return load_settings(path, environ or {})

    return loaded


@pytest.fixture
def faults(load: Load, tmp_path: Path) -> Faults:
    """The faults of a file with this text, one line each, without the file's folder."""

    def found(text: str, environ: Mapping[str, str] | None = None) -> list[str]:
        with pytest.raises(SettingsFaults) as caught:
            load(text, environ)
        assert caught.value.path == tmp_path / "knickpoint.toml"
        assert str(caught.value).splitlines() == [str(fault) for fault in caught.value.faults]
        return [str(fault).replace(f"{tmp_path}/", "") for fault in caught.value.faults]

    return found
