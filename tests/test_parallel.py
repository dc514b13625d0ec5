"""Tasks spread over processes: order, memory, failure."""

import multiprocessing
import operator
import os
from collections.abc import Iterator
from types import MappingProxyType

import pytest

from melodycoach import parallel
from melodycoach.errors import MelodycoachError


def test_the_number_of_cores_is_known_everywhere(monkeypatch: pytest.MonkeyPatch) -> None:
    assert parallel.n_cores() >= 1
    monkeypatch.delattr(os, "sched_getaffinity", raising=False)
    monkeypatch.setattr(os, "cpu_count", lambda: None)
    assert parallel.n_cores() == 1


@pytest.mark.parametrize("n_tasks", [0, 7, 51])
def test_one_worker_takes_each_task_when_it_is_needed(n_tasks: int) -> None:
    taken: list[int] = []

    def tasks() -> Iterator[int]:
        for task in range(n_tasks):
            taken.append(task)
            yield task

    answers = parallel.spread(10, operator.add, tasks(), 1)
    assert taken == []
    assert list(answers) == [10 + task for task in range(n_tasks)]


def test_few_tasks_start_no_process(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(parallel, "ProcessPoolExecutor", None)  # calling it would fail
    assert list(parallel.spread(1, operator.add, range(50), 2)) == list(range(1, 51))


def test_a_helper_process_works_with_its_own_bench(monkeypatch: pytest.MonkeyPatch) -> None:
    handled: list[object] = []
    monkeypatch.setattr(parallel, "_bench", None)
    monkeypatch.setattr(parallel.signal, "signal", lambda *action: handled.append(action))
    parallel._settle_in(100)
    assert handled == [(parallel.signal.SIGINT, parallel.signal.SIG_IGN)]
    assert parallel._do(operator.add, [1, 2]) == [101, 102]


def test_read_only_mappings_travel() -> None:
    rebuild, arguments = parallel._plain(MappingProxyType({8: 7.0}))
    rebuilt = rebuild(*arguments)
    assert rebuilt == {8: 7.0}
    assert isinstance(rebuilt, MappingProxyType)


@pytest.mark.slow
def test_the_answers_of_several_processes_come_in_the_order_of_the_tasks() -> None:
    bench = MappingProxyType({task: task * task for task in range(200)})
    assert list(parallel.spread(bench, operator.getitem, range(200), 3)) == [
        task * task for task in range(200)
    ]


@pytest.mark.slow
def test_processes_are_ended_when_nobody_takes_the_answers() -> None:
    answers = parallel.spread(1, operator.add, range(200), 2)
    assert next(answers) == 1
    answers.close()  # type: ignore[attr-defined]
    assert not [child for child in multiprocessing.active_children() if child.is_alive()]


@pytest.mark.slow
def test_a_helper_process_that_dies_is_said() -> None:
    # each task calls os._exit(3) in the helper process: the "bench" is the function to call
    with pytest.raises(MelodycoachError) as caught:
        list(parallel.spread(os._exit, operator.call, [3] * 60, 2))  # type: ignore[arg-type]
    assert str(caught.value) == (
        "a helper process ended before its time, perhaps for want of memory; "
        "close other programs and measure again"
    )
