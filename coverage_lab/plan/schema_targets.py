"""What a plan may ask of its n: [precision], [rare], [decision]; and what the sample has to make up for."""

from typing import Annotated, ClassVar, Literal, Self

from pydantic import AfterValidator, Field, model_validator

from coverage_lab.plan.schema import PERCENT, SHARE, Share, Table, between, between_keys, distinct

MOST_EVENTS = 1_000_000
WITHOUT_LIMIT = "to be left out unless limit is given"
UNSEEN = "to be left out unless see_at_least is given"

Events = Annotated[int, Field(ge=0, le=MOST_EVENTS)]
Rate = Annotated[float, Field(ge=0, lt=1)]
RATE = "a number of at least 0 and below 1"
CHANCE = "a number from 0 to 1"
MOST_TESTED = 1_000_000
TESTED = between(1, MOST_TESTED)
Tested = Annotated[int, Field(ge=1, le=MOST_TESTED)]


class TargetTable(Table):
    """A table that sets targets only where it is present."""

    optional: ClassVar[bool] = True


class PrecisionTable(TargetTable):
    """[precision]: how narrow the interval has to be."""

    half_width: Share | None = Field(None, description=SHARE, json_schema_extra=PERCENT)
    assurance: Share | None = Field(
        None, description=f"{SHARE}; no sample short of the whole population is certain", json_schema_extra=PERCENT
    )

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.half_width is None:
            raise between_keys("needs", "the key half_width")
        return self


class RareTable(TargetTable):
    """[rare]: a rate to be ruled out, and events to be seen. Always one-sided."""

    limit: Share | None = Field(None, description=SHARE, json_schema_extra=PERCENT)
    events: Annotated[list[Events], AfterValidator(distinct), Field(min_length=1)] | None = Field(
        None,
        description=f"a list of different whole numbers from 0 to {MOST_EVENTS}, at least one",
        json_schema_extra={"item": between(0, MOST_EVENTS)},
    )
    hoped_for: Rate | None = Field(None, description="a number of at least 0 and below 1", json_schema_extra=PERCENT)
    see_at_least: Annotated[int, Field(ge=1, le=MOST_EVENTS)] | None = Field(None, description=between(1, MOST_EVENTS))
    at_rate: Share | None = Field(None, description=SHARE, json_schema_extra=PERCENT)
    with_probability: Share | None = Field(
        None, description=f"{SHARE}; no sample short of the whole population is certain", json_schema_extra=PERCENT
    )

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.limit is None and self.see_at_least is None:
            raise between_keys("needs", "the key limit or see_at_least")
        if self.see_at_least is not None and self.at_rate is None:
            raise between_keys("needs", "the key at_rate, since see_at_least is given")
        needless = {"events": WITHOUT_LIMIT, "hoped_for": WITHOUT_LIMIT} if self.limit is None else {}
        needless |= {"at_rate": UNSEEN, "with_probability": UNSEEN} if self.see_at_least is None else {}
        for key, what in needless.items():
            if getattr(self, key) is not None:
                raise between_keys("field", what, key)
        if self.limit is not None and self.hoped_for is not None and self.hoped_for >= self.limit:
            raise between_keys("field", f"a rate below the {self.limit} that is to be ruled out", "hoped_for")
        return self


class DecisionTable(TargetTable):
    """[decision]: a claim that the proportion is on one side of a goal."""

    goal: Share | None = Field(None, description=SHARE, json_schema_extra=PERCENT)
    believed: Annotated[float, Field(ge=0, le=1)] | None = Field(
        None, description="a number from 0 to 1", json_schema_extra=PERCENT
    )
    alpha: Annotated[float, Field(gt=0, lt=0.5)] | None = Field(
        None, description="a number strictly between 0 and 0.5", json_schema_extra=PERCENT
    )
    power: Share = Field(0.8, description=SHARE, json_schema_extra=PERCENT)

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.goal is None or self.believed is None:
            raise between_keys("needs", "the keys goal and believed")
        if self.goal == self.believed:
            raise between_keys("field", f"a proportion other than the goal, {self.goal}", "believed")
        if self.alpha is not None and self.power <= self.alpha:
            raise between_keys("field", f"a number above alpha, {self.alpha}", "power")
        return self


class LossTable(TargetTable):
    """[design.loss]: units that yield no result."""

    rate: Rate | None = Field(None, description=RATE, json_schema_extra=PERCENT)
    rate_events: Rate | None = Field(None, description=RATE, json_schema_extra=PERCENT)
    rate_others: Rate | None = Field(None, description=RATE, json_schema_extra=PERCENT)
    treat_as: Literal["excluded", "events", "non-events"] = Field(
        "excluded", description="excluded, events or non-events"
    )

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        by_outcome = {"rate_events": self.rate_events, "rate_others": self.rate_others}
        given = [key for key, rate in by_outcome.items() if rate is not None]
        if self.rate is None and len(given) < len(by_outcome):
            raise between_keys("needs", "the key rate, or both rate_events and rate_others")
        if self.rate is not None and given:
            raise between_keys("field", "to be left out, since rate is given", given[0])
        return self


class ClassificationTable(TargetTable):
    """[design.classification]: the test that units are seen through."""

    sensitivity: float | None = Field(None, description=CHANCE, json_schema_extra=PERCENT)
    specificity: float | None = Field(None, description=CHANCE, json_schema_extra=PERCENT)
    diseased_tested: Tested | None = Field(None, description=TESTED)
    healthy_tested: Tested | None = Field(None, description=TESTED)

    @model_validator(mode="after")
    def _holds_together(self) -> Self:
        if self.sensitivity is None or self.specificity is None:
            raise between_keys("needs", "the keys sensitivity and specificity")
        return self
