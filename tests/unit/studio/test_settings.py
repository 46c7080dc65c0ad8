"""Settings survive a restart; what is unreadable falls back."""

from studio.settings import MOST_RECENT, Settings


def test_theme_is_remembered_and_nonsense_falls_back(tmp_path):
    settings = Settings(tmp_path / "w.ini")
    assert settings.theme == "system"
    settings.theme = "dark"
    settings.write()
    assert Settings(tmp_path / "w.ini").theme == "dark"
    settings.theme = "plaid"
    assert settings.theme == "system"


def test_recent_files_latest_first_without_those_gone(tmp_path):
    settings = Settings(tmp_path / "w.ini")
    paths = [tmp_path / f"{number}.json" for number in range(MOST_RECENT + 3)]
    for path in paths:
        path.write_text("{}", encoding="utf-8")
        settings.remember(path)
    assert settings.recent == [path.resolve() for path in reversed(paths)][:MOST_RECENT]
    settings.remember(paths[5])
    assert settings.recent[0] == paths[5].resolve()
    paths[5].unlink()
    assert paths[5].resolve() not in settings.recent
