"""What the search for antenna heights may do."""

from dataclasses import dataclass
from typing import Annotated, Literal

from profiler.models.stated import Key, Stated, require
from profiler.units import K_MEDIAN

__all__ = ["HeightsChoice", "Obstruction", "TowerChoice"]

Obstruction = Literal["isolated", "extended"]


@dataclass(frozen=True, slots=True)
class TowerChoice(Stated):
    """What a tower allows and costs: range and step of positions, taken ones, price per metre and above a limit.

    Positions are the whole multiples of ``step_m`` above ground from ``lowest_m`` to ``highest_m``, both included;
    with ``lowest_m`` equal to ``highest_m`` that one height, whatever the step. A position closer than
    ``taken_clearance_m`` to one of ``taken_m`` is not free. ``threshold_cost`` is paid once for an antenna above
    ``threshold_m`` (not for one at it).
    """

    lowest_m: Annotated[float, Key("position of an antenna", above=0, below=2000, example=5)] = 1.0
    highest_m: Annotated[float, Key("position of an antenna", above=0, below=2000, example=60)] = 150.0
    step_m: Annotated[float, Key("positions are its whole multiples", least=0.01, example=1)] = 1.0
    taken_m: Annotated[
        tuple[float, ...], Key("positions of others", above=0, below=2000, left_out="none", example=[24, 41.5])
    ] = ()
    taken_clearance_m: Annotated[float, Key("to keep from what is taken", least=0, below=2000, example=2)] = 1.0
    cost_per_m: Annotated[float, Key("of height, in a currency of your own", least=0, most=1e9, example=1.0)] = 1.0
    threshold_m: Annotated[float | None, Key("above it the tower needs more", above=0, left_out="none", example=45)] = (
        None
    )
    threshold_cost: Annotated[
        float, Key("paid once for an antenna above the threshold", least=0, most=1e12, example=20)
    ] = 0.0

    def _agree(self) -> None:
        require(self.highest_m >= self.lowest_m, "highest_m", self.highest_m, f"at least lowest_m = {self.lowest_m:g}")


@dataclass(frozen=True, slots=True)
class HeightsChoice(Stated):
    """What the search for antenna heights may do at each tower, and the optional loss limit.

    ``diversity_obstruction`` says what the ground does to the lower antenna of a diversity pair (Rec. ITU-R P.530-18
    §2.2.2): one or two isolated obstacles, or an extended one, which asks for more clearance.
    """

    tower_a: Annotated[TowerChoice, Key("the tower at site A", name="a")] = TowerChoice()
    tower_b: Annotated[TowerChoice, Key("the tower at site B", name="b")] = TowerChoice()
    loss_limit_db: Annotated[float | None, Key("of diffraction", least=0, left_out="none", example=6)] = None
    loss_k: Annotated[float, Key("at which that loss is held", least=0.1, most=100, example=1.0)] = K_MEDIAN
    diversity_obstruction: Annotated[
        Obstruction, Key("what stands below the lower antenna of a diversity pair", example="extended")
    ] = "extended"
