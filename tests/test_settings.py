import pickle
import subprocess
import sys

import pydantic
import pytest

from foredeck.assets import example_folder
from foredeck.errors import SettingsError
from foredeck.periods import Frequency
from foredeck.settings.file import load_settings
from foredeck.settings.model import Settings

BASE = """\
[source]
file = "actuals.csv"

[columns]
series = ["depot", "family"]
period = "month"
value = "cases"
"""


@pytest.fixture
def load(tmp_path):
    def loaded(text, **options):
        path = tmp_path / "settings.toml"
        path.write_text(text, encoding="utf-8")
        return load_settings(path, **options)
    return loaded


@pytest.fixture
def refused(load, tmp_path):
    """Return the message for a text, with the path of the file cut to its name."""
    def message(text, **options):
        with pytest.raises(SettingsError) as caught:
            load(text, **options)
        assert str(pickle.loads(pickle.dumps(caught.value))) == str(caught.value)
        return str(caught.value).replace(str(tmp_path) + "/", "")
    return message


def test_the_least_settings_get_the_defaults_that_are_documented(load, tmp_path):
    settings = load(BASE)
    assert settings.source.file == tmp_path / "actuals.csv"
    source = settings.source
    assert (source.layout, source.decimal, source.sum_rows) == ("long", ".", False)
    assert settings.columns.groups == ("depot", "family")
    rules = settings.series
    assert (rules.unit, rules.frequency, rules.gaps) == ("units", None, "missing")
    assert (settings.closing.rule, settings.closing.share) == ("all", 1.0)
    forecast = settings.forecast
    assert (forecast.horizon, forecast.levels, forecast.style) == (12, (50, 90), "blend")
    assert (forecast.methods, forecast.constants, forecast.nonnegative) == ((), {}, True)
    assert settings.windows == {"next 3": 3}
    assert (settings.year.first_month, settings.language.code) == (1, "en")
    assert settings.ledger.folder == tmp_path / "ledger"
    assert settings.adjustments.file is settings.comparisons.budget is settings.comparisons.earlier is None
    pack = settings.pack
    assert (pack.folder, pack.reports, pack.workers) == (tmp_path / "pack", "all", 2)


def test_everything_that_is_written_is_read(load, tmp_path):
    settings = load("""\
        [source]
        file = "in/actuals.xlsx"
        layout = "wide"
        sheet = "cases"
        sum_rows = true
        date_format = "DD/MM/YYYY"
        [columns]
        series = "code"
        groups = "depot"
        unit_value = "price"
        [series]
        unit = "cases"
        frequency = "weekly"
        gaps = "zero"
        [closing]
        rule = "share"
        share = 0.9
        [forecast]
        horizon = 26
        levels = [80]
        style = "single"
        methods = ["ses"]
        constants = {alpha = 0.2, phi = 1}
        nonnegative = false
        [windows]
        "next 13" = 13
        [comparisons]
        budget = "/elsewhere/budget.csv"
        [pack]
        formats = ["html"]
        reports = ["007", "NA"]
        workers = 1
        """)
    assert (settings.columns.series, settings.columns.groups) == (("code",), ("depot",))
    assert settings.source.file == tmp_path / "in" / "actuals.xlsx"
    assert settings.series.frequency is Frequency.WEEKLY
    assert settings.forecast.constants == {"alpha": 0.2, "phi": 1.0}
    assert settings.windows == {"next 13": 13}
    assert str(settings.comparisons.budget) == "/elsewhere/budget.csv"
    assert settings.pack.reports == ("007", "NA")
    assert settings.closing.share == 0.9


def test_the_settings_of_the_example_are_read():
    settings = load_settings(example_folder() / "settings.toml")
    assert settings.columns.series == ("depot", "family")
    assert settings.source.file.is_file()


def test_a_wrong_key_names_key_line_what_is_allowed_and_the_nearest(refused):
    assert refused(BASE + "\n[forecast]\nlevels = [50]\nhorizont = 6\n") == (
        "[forecast] horizont is not a key of the settings\n"
        "  where: settings.toml line 11\n"
        "  allowed: horizon, levels, style, methods, constants, nonnegative\n"
        "  next: did you mean 'horizon'?")


def test_a_wrong_section_names_the_sections(refused):
    assert refused(BASE + "[forcast]\nhorizon = 6\n") == (
        "[forcast] is not a section of the settings\n"
        "  where: settings.toml line 8\n"
        "  allowed: source, columns, series, closing, forecast, windows, year, language, ledger, "
        "adjustments, comparisons, pack\n"
        "  next: did you mean 'forecast'?")


def test_a_wrong_value_names_key_line_what_is_allowed_and_the_nearest(refused):
    assert refused(BASE + '[forecast]\nstyle = "blnd"\n') == (
        '[forecast] style = "blnd" is not allowed\n'
        "  where: settings.toml line 9\n"
        '  allowed: "blend" or "single"\n'
        "  next: did you mean 'blend'?")


@pytest.mark.parametrize(("lines", "key", "allowed"), [
    ("[forecast]\nhorizon = 0", "[forecast] horizon = 0", "a whole number of periods from 1 to 120"),
    ("[forecast]\nhorizon = true", "[forecast] horizon = true", "a whole number of periods from 1 to 120"),
    ('[forecast]\nhorizon = "12"', '[forecast] horizon = "12"', "a whole number of periods from 1 to 120"),
    ("[forecast]\nhorizon = 12.0", "[forecast] horizon = 12.0", "a whole number of periods from 1 to 120"),
    ("[forecast]\nlevels = [90, 50]", "[forecast] levels = [90, 50]",
     "a list of whole percentages from 1 to 99, rising"),
    ("[forecast]\nlevels = []", "[forecast] levels = []", "a list of whole percentages from 1 to 99, rising"),
    ("[forecast]\nconstants = {alpha = 1.5}", "[forecast] constants.alpha = 1.5",
     "a table of alpha, beta, gamma, phi, each from 0 to 1"),
    ("[forecast.constants]\nalpha = nan", "[forecast] constants.alpha = NaN",
     "a table of alpha, beta, gamma, phi, each from 0 to 1"),
    ("[closing]\nshare = 0", "[closing] share = 0", "a share above 0, up to 1"),
    ("[year]\nfirst_month = 13", "[year] first_month = 13", "1 (January) to 12 (December)"),
    ('[pack]\nformats = ["pdf"]', '[pack] formats = ["pdf"]',
     'a list of "html", "workbook", "parquet", "csv"'),
    ('[pack]\nreports = ["a", 3]', '[pack] reports = ["a", 3]', '"all", "none", or a list of series names'),
    ('[windows]\n"next 3" = "x"', '[windows] next 3 = "x"',
     "names, each with a whole number of periods from 1 to 120"),
])
def test_a_value_outside_what_is_allowed_is_refused(refused, lines, key, allowed):
    assert refused(BASE + lines + "\n") == (
        f"{key} is not allowed\n"
        "  where: settings.toml line 9\n"
        f"  allowed: {allowed}\n"
        "  next: correct the value")


def test_an_unknown_constant_is_refused(refused):
    assert refused(BASE + "[forecast]\nconstants = {alfa = 0.1}\n") == (
        "[forecast] constants.alfa is not a key of the settings\n"
        "  where: settings.toml line 9\n"
        "  allowed: alpha, beta, gamma, phi\n"
        "  next: did you mean 'alpha'?")


def test_the_first_fault_is_told_and_the_others_are_named(refused):
    assert refused(BASE + '[pack]\nworkers = 0\n[series]\nfrequency = "montly"\nunits = "cases"\n') == (
        "[pack] workers = 0 is not allowed\n"
        "  where: settings.toml line 9\n"
        "  allowed: a whole number from 1 to 64\n"
        "  next: correct the value; then mend [series] frequency, [series] units too")


def test_missing_sections_and_keys_are_named(refused):
    assert refused('[source]\nfile = "a.csv"\n') == (
        "[columns] is missing\n"
        "  where: settings.toml\n"
        "  allowed: a section with series, period, value, groups, unit_value\n"
        "  next: add [columns]")
    assert refused(BASE.replace('value = "cases"\n', "")) == (
        "[columns] value is missing\n"
        "  where: settings.toml line 4\n"
        "  allowed: the column of the value (long layout)\n"
        "  next: add [columns] value")


def test_wrong_toml_gives_the_line(refused):
    assert refused(BASE + "[forecast]\nhorizon = twelve\n") == (
        "the settings are not valid TOML: Invalid value (at line 9, column 11)\n"
        "  where: settings.toml\n"
        '  allowed: sections such as [source] and lines such as file = "actuals.csv"\n'
        "  next: correct the line; texts stand in quotes, numbers as 0.1")


def test_settings_that_contradict_each_other_are_refused(refused):
    assert refused(BASE + "[closing]\nshare = 0.9\n") == (
        '[closing] share = 0.9 contradicts rule = "all"\n'
        "  where: settings.toml line 9\n"
        '  allowed: a share with rule = "share"\n'
        '  next: write rule = "share", or take out the share')
    assert refused(BASE + '[forecast]\nhorizon = 6\n[windows]\n"next 9" = 9\n') == (
        "[windows] next 9 = 9 reaches beyond the horizon\n"
        "  where: settings.toml line 11\n"
        "  allowed: 1 to 6, the [forecast] horizon\n"
        "  next: shorten the window or lengthen the horizon")


def test_methods_are_compared_with_those_that_there_are(refused, load):
    text = BASE + '[forecast]\nmethods = ["ses", "hollt"]\n'
    assert refused(text, methods=["ses", "holt"]) == (
        "[forecast] methods names 'hollt', which is not a method\n"
        "  where: settings.toml line 9\n"
        "  allowed: ses, holt\n"
        "  next: did you mean 'holt'?")
    assert load(text.replace("hollt", "holt"), methods=["ses", "holt"]).forecast.methods == ("ses", "holt")


def test_a_missing_file_and_a_wrong_encoding_are_refused(tmp_path):
    with pytest.raises(SettingsError) as caught:
        load_settings(tmp_path / "none.toml")
    assert str(caught.value) == (
        "the settings file cannot be read: No such file or directory\n"
        f"  where: {tmp_path / 'none.toml'}\n"
        "  allowed: a file such as settings.toml\n"
        "  next: give the path of a settings file; foredeck start FOLDER makes one")
    (tmp_path / "latin.toml").write_bytes(BASE.encode() + '[series]\nunit = "St\xfcck"\n'.encode("latin-1"))
    with pytest.raises(SettingsError) as caught:
        load_settings(tmp_path / "latin.toml")
    assert str(caught.value) == (
        "the settings are not UTF-8 text: byte 0xfc\n"
        f"  where: {tmp_path / 'latin.toml'} line 9\n"
        "  allowed: text in UTF-8\n"
        "  next: save the file as UTF-8")


def test_a_short_horizon_shortens_the_window_that_nobody_named(load):
    assert load(BASE + "[forecast]\nhorizon = 2\n").windows == {"next 2": 2}


def test_settings_are_frozen_and_keep_their_text_through_pickling(load):
    settings = load(BASE)
    with pytest.raises(pydantic.ValidationError):
        settings.forecast.horizon = 6
    again = pickle.loads(pickle.dumps(settings))
    assert isinstance(again, Settings)
    assert (again.text, again.fingerprint, again.path) == (BASE, settings.fingerprint, settings.path)


def test_the_fingerprint_follows_what_is_set_and_not_how_it_is_written(load, tmp_path):
    plain = load(BASE).fingerprint
    respelt = "# a comment\n" + BASE.replace(" = ", "=") + "[forecast]\nhorizon = 12\n"
    assert load(respelt).fingerprint == plain
    assert load(BASE + "[forecast]\nhorizon = 6\n").fingerprint != plain
    (tmp_path / "elsewhere").mkdir()
    (tmp_path / "elsewhere" / "settings.toml").write_text(BASE)
    assert load_settings(tmp_path / "elsewhere" / "settings.toml").fingerprint == plain


def test_a_byte_order_mark_and_windows_line_ends_do_no_harm(tmp_path):
    path = tmp_path / "settings.toml"
    path.write_bytes(b"\xef\xbb\xbf" + BASE.replace("\n", "\r\n").encode())
    assert load_settings(path).columns.value == "cases"


def test_reading_settings_imports_no_heavy_package():
    code = ("import sys, foredeck.settings.file; heavy = {'pandas', 'numpy', 'numba', 'plotly', 'sqlalchemy'}; "
            "print(sorted(heavy & set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
