"""Work and exchanges on copies do what the simulation's bench does, with every draw at its mean."""

from planner.after_work import after_exchange, after_visit
from planner.picture import flown_to, foreseen, picture
from sim.fleet import WearRow
from sim.spec import CHECK, NONE, RESTORATION
from sim.view import Scope
from tests.sim.builders import tiny_fleet

WEAR = tuple(
    WearRow(
        engine_type="T",
        rating="one",
        module=m,
        early_loss_degC=4.0,
        loss_degC_per_1000_cycles=10.0,
        unrecoverable_degC=3,
    )
    for m in ("fan", "core")
)


def test_a_visit_restores_and_renews_what_it_says_and_nothing_else() -> None:
    view = picture(tiny_fleet(wear=WEAR))
    worn = flown_to(view, view.engine("E1"), "A1", cycles=900)
    for module in worn.modules:
        module.first_run = True
    visit = Scope("core", (CHECK, RESTORATION), ((), (0,)))
    built = after_visit(view, worn, visit, rating=0, day=225.0)
    fan, core = built.modules
    assert (fan.csr, core.csr) == (900, 0)
    assert fan.lost_degC(0) == worn.modules[0].lost_degC(0)
    assert core.lost_degC(0) == 3.0
    assert foreseen(view, built, "A1", day=225.0).cycles == 1000
    assert foreseen(view, worn, "A1", day=225.0).cycles == 100


def test_without_work_nothing_changes() -> None:
    view = picture(tiny_fleet(wear=WEAR))
    worn = flown_to(view, view.engine("E1"), "A1", cycles=900)
    same = after_visit(view, worn, Scope("quick", (NONE, NONE), ((), ())), rating=0, day=225.0)
    assert foreseen(view, same, "A1", day=225.0).cycles == 100
    assert same.modules[1].csb == 900


def test_an_exchanged_module_brings_its_own_life_and_wear() -> None:
    view = picture(tiny_fleet(wear=WEAR))
    worn = flown_to(view, view.engine("E1"), "A1", cycles=900)
    fresh = view.modules["core-2"]
    swapped = after_exchange(worn, {1: fresh})
    assert swapped.modules[1].serial == "core-2"
    assert foreseen(view, swapped, "A1", day=225.0).cycles == 1000
    assert worn.modules[1].serial == "core-1"
