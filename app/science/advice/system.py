"""What an application system can deliver to one field."""

from dataclasses import dataclass

from app.science.crop.season import check_range


@dataclass(frozen=True, kw_only=True)
class ApplicationSystem:
    """Efficiency, rate and limits of an application system.

    efficiency: net over gross, 0.1-1. rate_mm_h: gross depth an hour over the field while it
    runs. least_mm, most_mm: gross depth of one application. interval_days: least days from one
    application to the next. cover_days: days needed to cover the field once. hours_per_day: most
    running hours a day, above 0 to 24. Raises ValueError naming the field.
    """

    efficiency: float
    rate_mm_h: float
    least_mm: float
    most_mm: float
    interval_days: int = 1
    cover_days: int = 1
    hours_per_day: float = 24.0

    def __post_init__(self) -> None:
        check_range("efficiency", self.efficiency, 0.1, 1.0)
        check_range("rate_mm_h", self.rate_mm_h, 0.01, 1000.0)
        check_range("hours_per_day", self.hours_per_day, 0.1, 24.0)
        check_range("interval_days", self.interval_days, 1, 365)
        check_range("cover_days", self.cover_days, 1, 60)
        check_range("least_mm", self.least_mm, 0.0, 1000.0)
        check_range("most_mm", self.most_mm, max(self.least_mm, 0.01), 1000.0)
        if self.deliverable_mm < self.least_mm:
            raise ValueError(
                f"the hours allow only {self.deliverable_mm:.1f} mm an application "
                f"({self.rate_mm_h:g} mm/h, {self.hours_per_day:g} h/day, {self.cover_days} days), "
                f"less than least_mm {self.least_mm:g}: mend the rate, the hours or least_mm"
            )

    @property
    def deliverable_mm(self) -> float:
        """Greatest gross depth [mm] of one application, by `most_mm` and by the hours."""
        return min(self.most_mm, self.rate_mm_h * self.hours_per_day * self.cover_days)
