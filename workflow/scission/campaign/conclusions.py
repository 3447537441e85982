"""What a campaign file may say of conclusions: thresholds, the rule of the flags, fits, comparison."""

from typing import Annotated, Literal

from pydantic import BeforeValidator, Field

from scission.campaign.fields import Strict, map_or_null, null_is_empty

Model = Literal["morse", "extended-rydberg"]


def _all_models() -> list[Model]:
    return ["morse", "extended-rydberg"]


class Threshold(Strict):
    """A threshold of your own for one diagnostic."""

    value: float = Field(description="Value at which the diagnostic counts as over.", examples=[0.02])
    source: str = Field(
        min_length=1,
        description="Where the value comes from: a publication or your own study.",
        examples=["..."],
    )
    strong: float | None = Field(
        None, description="Value from which the diagnostic speaks strongly; null: as far beyond as is usual."
    )
    direction: Literal["above", "below"] | None = Field(
        None,
        description="Side of the value that is over; only for a diagnostic without a threshold of its own.",
    )


class Weight(Strict):
    """A weight of your own for one diagnostic in the rule of the flags."""

    value: float = Field(
        ge=0.0, le=10.0, description="Weight in the mean grade; 0 leaves it out.", examples=[0.5]
    )
    source: str = Field(
        min_length=1,
        description="Where the weight comes from: a publication or your own study.",
        examples=["..."],
    )


class Limits(Strict):
    """Mean grades, between 0 and 2, at which a point changes its flag."""

    borderline: float = Field(0.5, gt=0.0, le=2.0, description="Mean grade from which a point is borderline.")
    multireference: float = Field(
        1.5, gt=0.0, le=2.0, description="Mean grade from which a point is multireference."
    )
    source: str = Field(min_length=1, description="Where the limits come from.", examples=["..."])


class Diagnostics(Strict):
    """Overrides of thresholds and of the rule, and diagnostics beyond the standard ones."""

    thresholds: Annotated[dict[str, Threshold], BeforeValidator(null_is_empty)] = Field(
        default_factory=dict,
        description="Diagnostic name: {value, source}; the source is required.",
        json_schema_extra=map_or_null,
    )
    weights: Annotated[dict[str, Weight], BeforeValidator(null_is_empty)] = Field(
        default_factory=dict,
        description="Diagnostic name: {value, source}; what it weighs in the flag, 0 leaves it out.",
        json_schema_extra=map_or_null,
    )
    limits: Limits | None = Field(
        None, description="Mean grades at which the flag changes, {borderline, multireference, source}."
    )
    include: list[str] = Field(
        default_factory=list,
        description="Further diagnostics to compute, by name; some cost extra time.",
        json_schema_extra={"default": []},
    )


class Fit(Strict):
    """How curves are fitted."""

    models: list[Model] = Field(
        default_factory=_all_models,
        min_length=1,
        description="Curve models to fit and to choose from.",
        json_schema_extra={"default": ["morse", "extended-rydberg"]},
    )


class Comparison(Strict):
    """How levels are compared with the reference level."""

    tolerance_kcal_per_mol: float = Field(
        1.0, gt=0.0, le=1000.0, description="Error up to which a level counts as right, from the minimum."
    )
