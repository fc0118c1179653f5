"""Executors: the same answer whoever does the work, interrupts, and workers that die."""

import os
import pickle
from concurrent.futures import ProcessPoolExecutor, ThreadPoolExecutor
from dataclasses import dataclass
from multiprocessing import get_context

import pytest
from makers import BRIEF, FILMS, brief

from tcplan.effort import Effort
from tcplan.errors import InputError, Stopped
from tcplan.workflow.executors import executor_for
from tcplan.workflow.planning import make_plan

THIRD = FILMS.replace("material.pp", "material.qq").replace("-120 ppm/K", "-900 ppm/K")
TEXT = BRIEF + FILMS + THIRD.split("[material.np]")[0]


def figures(effort):
    return [option.to_dict() for option in make_plan(brief(TEXT), effort=effort).options]


@pytest.fixture(scope="module")
def alone():
    return figures(Effort())


def test_threads_give_the_same_answer(alone):
    with ThreadPoolExecutor(2) as pool:
        assert figures(Effort(executor=pool)) == alone


def test_processes_give_the_same_answer(alone):
    with executor_for(2, None) as pool:
        assert isinstance(pool, ProcessPoolExecutor)
        assert figures(Effort(executor=pool)) == alone


def test_a_real_dask_cluster_gives_the_same_answer(alone):
    """A LocalCluster on loopback, reached by its address as a user would."""
    from distributed import LocalCluster

    with (
        LocalCluster(
            n_workers=1,
            threads_per_worker=1,
            processes=False,
            protocol="tcp://",
            dashboard_address="127.0.0.1:0",
            host="127.0.0.1",
        ) as cluster,
        executor_for(1, cluster.scheduler_address) as executor,
    ):
        assert figures(Effort(executor=executor)) == alone


def test_a_scheduler_that_is_not_there_is_an_input_error():
    with pytest.raises(InputError, match="scheduler"), executor_for(1, "not an address"):
        pass


def test_progress_is_told_of_every_task(alone):
    told = []
    figures(Effort(report=lambda done, total: told.append((done, total))))
    assert told[0][0] == 1
    assert all(done <= total for done, total in told)


@dataclass(frozen=True)
class Dies:
    """A task that kills the process it runs in, unless that is the one that made it."""

    home: int
    name: str = "a task that dies"

    def run(self) -> int:
        if os.getpid() != self.home:
            os._exit(3)
        return 7


def test_a_task_whose_worker_dies_is_run_again():
    with ProcessPoolExecutor(1, mp_context=get_context("fork")) as pool:
        assert Effort(executor=pool).results([Dies(os.getpid())]) == [7]


@dataclass
class Interrupts:
    name: str = "interrupted"

    def run(self) -> int:
        raise KeyboardInterrupt


@dataclass
class Works:
    name: str = "works"

    def run(self) -> int:
        return 1


def test_an_interrupt_keeps_what_is_done():
    effort = Effort()
    assert effort.results([Works(), Interrupts(), Works()]) == [1]
    assert effort.stopped


def test_a_plan_that_is_interrupted_carries_the_best_so_far():
    def report(done, total):
        raise KeyboardInterrupt

    with pytest.raises(Stopped) as caught:
        make_plan(brief(TEXT), effort=Effort(report=report))
    assert caught.value.best.notes[0].startswith("Stopped early")
    assert caught.value.best.options


def test_tasks_can_be_sent():
    from makers import need_of, six_films

    from tcplan.plan import Space
    from tcplan.search.mixed_search import tasks_of

    films = six_films()
    space = Space(
        arrangement="mixed", materials=tuple(sorted(films)), most=2, min_share=0.0, legs=3, ohms=1e3
    )
    for task in tasks_of(space, need_of(), films):
        assert pickle.loads(pickle.dumps(task)).trees == task.trees
        assert "legs" in task.name


def test_work_that_is_interrupted_gives_way():
    """The second interrupt of a long plan comes in its proof: what was found until then is kept."""
    effort = Effort()
    assert effort.unless_stopped(lambda: 5, 0) == 5

    def interrupted():
        raise KeyboardInterrupt

    assert effort.unless_stopped(interrupted, 0) == 0
    assert effort.stopped
    assert effort.unless_stopped(lambda: 5, 0) == 0
