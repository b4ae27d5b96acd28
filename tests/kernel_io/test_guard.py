"""The seam around the kernel: every foreign exception is mapped, and a crash leaves its operands behind."""

from __future__ import annotations

import inspect
import subprocess
import sys
from pathlib import Path

import OCP.OCP  # noqa: F401  registers every kernel module
import pytest
from OCP.BRepGProp import BRepGProp
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from OCP.gp import gp_Dir, gp_Vec
from OCP.GProp import GProp_GProps
from OCP.TopoDS import TopoDS_Shape

from moldgen.errors import KernelError, PartError
from moldgen.kernel import guard


def kernel_exceptions() -> list[type[Exception]]:
    found = {
        thing
        for name, module in list(sys.modules.items())
        if name.split(".")[0] == "OCP" and module is not None
        for thing in vars(module).values()
        if inspect.isclass(thing) and issubclass(thing, Exception) and thing.__module__.startswith("OCP")
    }
    return sorted(found, key=lambda c: c.__name__)


@pytest.fixture
def evidence(tmp_path):
    guard.use_evidence_folder(tmp_path / "evidence")
    yield tmp_path / "evidence"
    guard.use_evidence_folder(None)


def test_the_list_of_kernel_exceptions_is_not_empty():
    # 106 were counted in OCP 7.9; a bound well below that fails if the search above goes blind.
    assert len(kernel_exceptions()) > 80


@pytest.mark.parametrize("foreign", kernel_exceptions(), ids=lambda c: c.__name__)
def test_every_kernel_exception_is_mapped_and_chained(foreign):
    with (
        pytest.raises(KernelError, match=r"cut the lid failed: .*faces=3") as caught,
        guard.operation("cut the lid", faces=3),
    ):
        raise foreign("reason")
    assert isinstance(caught.value.__cause__, foreign)


def test_an_exception_thrown_in_the_kernel_itself_is_mapped():
    with pytest.raises(KernelError, match="direction"), guard.operation("make a direction"):
        gp_Dir(gp_Vec(0, 0, 0))


@pytest.mark.parametrize("foreign", [RuntimeError("manifold"), ValueError("mesh"), MemoryError()])
def test_exceptions_of_the_mesh_libraries_are_mapped(foreign):
    with pytest.raises(KernelError), guard.operation("mesh the part"):
        raise foreign


def test_running_out_of_memory_says_so():
    with pytest.raises(KernelError, match="out of memory"), guard.operation("mesh the part"):
        raise MemoryError


def test_a_missing_result_handed_on_is_the_kernels_failure():
    with pytest.raises(KernelError), guard.operation("weigh"):
        BRepGProp.VolumeProperties_s(None, GProp_GProps())


@pytest.mark.parametrize(
    "ours", [PartError("too small"), FileNotFoundError(), AttributeError(), TypeError(), KeyError()]
)
def test_our_own_errors_and_mistakes_pass_unchanged(ours):
    with pytest.raises(type(ours)) as caught, guard.operation("cut"):
        raise ours
    assert caught.value is ours


def test_an_interrupt_passes():
    with pytest.raises(KeyboardInterrupt), guard.operation("cut"):
        raise KeyboardInterrupt


def test_a_failure_keeps_its_operands_and_success_keeps_nothing(evidence):
    box = BRepPrimAPI_MakeBox(1, 2, 3).Solid()
    with guard.operation("cut", operands=(box,), risky=True):
        assert guard.interrupted(evidence).operation == "cut"
        assert [p.name for p in Path(guard.interrupted(evidence).evidence).glob("*.brep")] == ["operand1.brep"]
    assert guard.interrupted(evidence) is None
    assert not list(evidence.glob("*/"))
    with pytest.raises(KernelError) as caught, guard.operation("cut", operands=(box, box)):
        raise RuntimeError
    assert sorted(p.name for p in Path(caught.value.evidence).iterdir()) == [
        "operand1.brep",
        "operand2.brep",
        "operation.txt",
    ]


def test_nested_operations_name_the_innermost_and_return_to_the_outer_one(evidence):
    with guard.operation("outer"):
        with guard.operation("inner"):
            assert guard.interrupted(evidence).operation == "inner"
        assert guard.interrupted(evidence).operation == "outer"


def test_evidence_is_bounded_and_spares_the_operation_under_way(evidence):
    box = BRepPrimAPI_MakeBox(1, 2, 3).Solid()
    with guard.operation("outer", operands=(box,), risky=True):
        kept = Path(guard.interrupted(evidence).evidence)
        for _ in range(3 * guard.MOST_KEPT):
            with pytest.raises(KernelError), guard.operation("cut", operands=(box,)):
                raise RuntimeError
        assert kept.is_dir()
        assert len(list(evidence.glob("*/"))) <= guard.MOST_KEPT + 1


def test_a_killed_process_leaves_name_and_operands(tmp_path):
    code = f"""
import os
from pathlib import Path
from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
from moldgen.kernel import guard
guard.use_evidence_folder(Path({str(tmp_path)!r}))
with guard.operation("imprint 38 curves", operands=(BRepPrimAPI_MakeBox(1, 2, 3).Solid(),), risky=True):
    os.abort()
"""
    done = subprocess.run([sys.executable, "-c", code], check=False, capture_output=True)
    assert done.returncode != 0
    left = guard.interrupted(tmp_path)
    assert left is not None
    assert left.operation == "imprint 38 curves"
    assert (Path(left.evidence) / "operand1.brep").stat().st_size > 0


def test_no_folder_means_no_evidence_and_no_marker(tmp_path):
    assert guard.keep_operands("cut", [BRepPrimAPI_MakeBox(1, 2, 3).Solid()]) == ""
    assert guard.interrupted(tmp_path) is None


def test_present_refuses_what_the_kernel_returns_for_nothing():
    with pytest.raises(KernelError, match="gave no shape"):
        guard.present(None, "cut")
    with pytest.raises(KernelError, match="gave no shape"):
        guard.present(TopoDS_Shape(), "cut")
