"""All settings: what to read, how to forecast and what to publish. Strict.

A key that is not known here is an error, never ignored: a setting that is misspelt
and passes in silence changes forecasts that people order by.
"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import (
    BaseModel,
    ConfigDict,
    Field,
    PrivateAttr,
    field_validator,
    model_validator,
)
from pydantic_core import PydanticCustomError

from foredeck.periods import Frequency

Text = Annotated[str, Field(min_length=1)]
Constant = Annotated[float, Field(ge=0, le=1, allow_inf_nan=False)]
Periods = Annotated[int, Field(ge=1, le=120)]
ConstantName = Literal["alpha", "beta", "gamma", "phi"]
_CSV_PATH = "the path of a CSV file, relative to the settings file"


class Section(BaseModel):
    """One section of the file; each field's description says what is allowed."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class Source(Section):
    """[source]: the file of actuals and how it is laid out."""

    file: Path = Field(description="the path of a CSV, Excel or Parquet file, relative to the settings file")
    layout: Literal["long", "wide"] = Field(
        default="long", description='"long" (one row a series and period) or "wide" (one column a period)')
    sheet: Text | None = Field(default=None, description="the name of a sheet of the workbook")
    sum_rows: bool = Field(default=False, description="true (rows of one period are added up) or false")
    delimiter: Text | None = Field(default=None, max_length=1, description='one character, such as ";"')
    decimal: Literal[".", ","] = Field(default=".", description='"." or ","')
    date_format: Text | None = Field(
        default=None, description='the name of a date format, such as "DD/MM/YYYY"')


class Columns(Section):
    """[columns]: which columns hold what."""

    series: tuple[Text, ...] = Field(min_length=1, description="a column name, or a list of column names "
                                                               "that together name a series")
    period: Text | None = Field(default=None, description="the column of the period (long layout)")
    value: Text | None = Field(default=None, description="the column of the value (long layout)")
    groups: tuple[Text, ...] = Field(default=(), description="a list of column names")
    unit_value: Text | None = Field(default=None, description="the column with the money for one unit")

    @model_validator(mode="before")
    @classmethod
    def _one_name_is_a_list(cls, given: Any) -> Any:
        if not isinstance(given, dict):
            return given
        given = dict(given)
        for key in {"series", "groups"} & given.keys():
            given[key] = (given[key],) if isinstance(given[key], str) else given[key]
            given[key] = tuple(given[key]) if isinstance(given[key], list) else given[key]
        if isinstance(given.get("series"), tuple) and len(given["series"]) > 1:
            given.setdefault("groups", given["series"])
        return given


class SeriesRules(Section):
    """[series]: what holds for every series."""

    unit: Text = Field(default="units", description="what the values count, as text")
    frequency: Frequency | None = Field(
        default=None, description='"yearly", "quarterly", "monthly" or "weekly"')
    gaps: Literal["missing", "zero"] = Field(
        default="missing", description='"missing" (not known) or "zero"')


class Closing(Section):
    """[closing]: when a period counts as closed."""

    rule: Literal["all", "share"] = Field(default="all", description='"all" or "share"')
    share: float = Field(default=1.0, gt=0, le=1, allow_inf_nan=False, description="a share above 0, up to 1")


class Forecast(Section):
    """[forecast]: how to forecast."""

    horizon: int = Field(default=12, ge=1, le=120, description="a whole number of periods from 1 to 120")
    levels: tuple[Annotated[int, Field(ge=1, le=99)], ...] = Field(
        default=(50, 90), min_length=1, description="a list of whole percentages from 1 to 99, rising")
    style: Literal["blend", "single"] = Field(default="blend", description='"blend" or "single"')
    methods: tuple[Text, ...] = Field(default=(), description="a list of method names; empty allows all")
    constants: dict[ConstantName, Constant] = Field(
        default_factory=dict, description="a table of alpha, beta, gamma, phi, each from 0 to 1")
    nonnegative: bool = Field(default=True, description="true (values cannot fall below zero) or false")

    @field_validator("levels")
    @classmethod
    def _rising(cls, levels: tuple[int, ...]) -> tuple[int, ...]:
        if list(levels) != sorted(set(levels)):
            raise PydanticCustomError("not_rising", "not rising")
        return levels


class Year(Section):
    """[year]: the financial year."""

    first_month: int = Field(default=1, ge=1, le=12, description="1 (January) to 12 (December)")


class Language(Section):
    """[language]: the language of the pack."""

    code: Literal["en"] = Field(default="en", description='"en"')


class LedgerPlace(Section):
    """[ledger]: where rounds are kept."""

    folder: Path = Field(default=Path("ledger"), description="a folder, relative to the settings file")


class AdjustmentsFile(Section):
    """[adjustments]: what people know that the history does not."""

    file: Path | None = Field(default=None, description=_CSV_PATH)


class Comparisons(Section):
    """[comparisons]: figures that stand beside the forecasts."""

    budget: Path | None = Field(default=None, description=_CSV_PATH)
    earlier: Path | None = Field(default=None, description=_CSV_PATH)


class Pack(Section):
    """[pack]: what is published."""

    folder: Path = Field(default=Path("pack"), description="a folder, relative to the settings file")
    title: Text = Field(default="Forecast round", description="a text")
    formats: tuple[Literal["html", "workbook", "parquet", "csv"], ...] = Field(
        default=("html", "workbook", "parquet"), description='a list of "html", "workbook", "parquet", "csv"')
    reports: Literal["all", "none"] | tuple[Text, ...] = Field(
        default="all", description='"all", "none", or a list of series names')
    workers: int = Field(default=2, ge=1, le=64, description="a whole number from 1 to 64")


class Settings(Section):
    """All settings of a portfolio, checked and frozen.

    Paths are absolute: they were given relative to the settings file.
    """

    source: Source
    columns: Columns
    series: SeriesRules = SeriesRules()
    closing: Closing = Closing()
    forecast: Forecast = Forecast()
    windows: dict[Text, Periods] = Field(
        default_factory=dict, description="names, each with a whole number of periods from 1 to 120")
    year: Year = Year()
    language: Language = Language()
    ledger: LedgerPlace = LedgerPlace()
    adjustments: AdjustmentsFile = AdjustmentsFile()
    comparisons: Comparisons = Comparisons()
    pack: Pack = Pack()

    _path: Path = PrivateAttr()
    _text: str = PrivateAttr()
    _fingerprint: str = PrivateAttr()

    @property
    def path(self) -> Path:
        """The settings file, absolute."""
        return self._path

    @property
    def text(self) -> str:
        """The settings file as it was written."""
        return self._text

    @property
    def fingerprint(self) -> str:
        """SHA-256 of the settings with their defaults, whatever the comments, order and place of the file."""
        return self._fingerprint
