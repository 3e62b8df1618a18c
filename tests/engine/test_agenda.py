from sweeps import grid

from scanner.engine.agenda import Agenda
from scanner.study import Plan

WHOLE = Plan(grid(), (1, 2), 256)
SPLIT = Plan(grid(), (1, 1), 128)
"""Tasks 0, 1 are the orbits of the first table, 2 sums them up; 3, 4 and 5 are those of the second; and so on."""


def take_all(agenda):
    taken = []
    while agenda:
        taken.append(agenda.take())
    return taken


def test_tasks_come_in_order():
    assert take_all(Agenda(WHOLE, ())) == [0, 1, 2, 3, 4]


def test_finished_tasks_do_not_come():
    assert take_all(Agenda(WHOLE, {0, 3})) == [1, 2, 4]


def test_a_table_is_summed_up_only_when_all_its_orbits_are_there():
    agenda = Agenda(SPLIT, ())
    assert [agenda.take() for _ in range(3)] == [0, 1, 3]
    agenda.settle(1)
    assert agenda.take() == 4
    agenda.settle(0)
    assert agenda.take() == 2
    agenda.settle(2)
    assert 2 not in take_all(agenda)


def test_orbits_of_an_earlier_run_count():
    assert take_all(Agenda(SPLIT, set(range(30)) - {1, 2, 5})) == [1, 5]


def test_a_lost_task_comes_first_again():
    agenda = Agenda(WHOLE, ())
    lost = agenda.take()
    agenda.give_back(lost)
    assert agenda.take() == lost
