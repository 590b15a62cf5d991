from pathlib import Path

import pytest

from foredeck import assets
from foredeck.errors import ReportError


@pytest.fixture
def wheel(tmp_path, monkeypatch):
    """A package as a wheel lays it out: assets inside the package."""
    for folder in ("notebooks", "templates", "example_data"):
        (tmp_path / "foredeck" / "_assets" / folder).mkdir(parents=True)
    (tmp_path / "foredeck" / "_assets" / "notebooks" / "series_report.ipynb").write_text("{}")
    monkeypatch.setattr(assets, "_PACKAGE", tmp_path / "foredeck")
    return tmp_path / "foredeck" / "_assets"


def test_in_a_checkout_the_assets_are_the_folders_at_its_top():
    top = Path(__file__).resolve().parent.parent
    assert assets.example_folder() == top / "example_data"
    assert (assets.example_folder() / "settings.toml").is_file()


def test_in_an_installed_wheel_the_assets_are_inside_the_package(wheel):
    assert assets.notebook_path("series_report") == wheel / "notebooks" / "series_report.ipynb"
    assert assets.template_folder() == wheel / "templates"
    assert assets.example_folder() == wheel / "example_data"


def test_the_wheel_maps_each_folder_to_where_it_is_looked_for():
    import tomllib

    top = Path(__file__).resolve().parent.parent
    wheel = tomllib.loads((top / "pyproject.toml").read_text())["tool"]["hatch"]["build"]["targets"]["wheel"]
    for folder in ("notebooks", "templates", "example_data"):
        assert folder in wheel["only-include"]
        assert wheel["sources"][folder] == f"foredeck/_assets/{folder}"


def test_an_unknown_notebook_is_refused_with_the_nearest(wheel):
    with pytest.raises(ReportError) as caught:
        assets.notebook_path("serie_report")
    assert str(caught.value) == (
        "there is no notebook 'serie_report'\n"
        f"  where: {wheel / 'notebooks'}\n"
        "  allowed: series_report\n"
        "  next: did you mean 'series_report'?")


def test_a_lost_folder_is_named(wheel):
    (wheel / "templates").rmdir()
    with pytest.raises(ReportError) as caught:
        assets.template_folder()
    assert str(caught.value) == (
        "the folder 'templates' of foredeck is not there\n"
        f"  where: {wheel}\n"
        "  allowed: notebooks, templates and example_data as they are installed\n"
        "  next: install foredeck again")
