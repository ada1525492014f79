"""Plan hot-wire cut EPS formwork: read a job, make its plan, write the plan folder.

Example:
    >>> import cutblock
    >>> job = cutblock.read_job("scenarios/weir-baffles/job.toml")  # doctest: +SKIP
    >>> plan = cutblock.make_plan(job)  # doctest: +SKIP
    >>> cutblock.write_plan(plan, "weir-baffles-plan")  # doctest: +SKIP
"""

from typing import TYPE_CHECKING

from cutblock.base.lazy import lazy_names

if TYPE_CHECKING:
    from cutblock import geometry, packing, wire
    from cutblock.flow.chain import make_plan
    from cutblock.flow.folder import write_plan
    from cutblock.flow.jobfile import read_job

__all__ = ["geometry", "make_plan", "packing", "read_job", "wire", "write_plan"]
__version__ = "0.1.0"

__getattr__ = lazy_names(
    __name__,
    {
        "read_job": "cutblock.flow.jobfile",
        "make_plan": "cutblock.flow.chain",
        "write_plan": "cutblock.flow.folder",
        "geometry": "cutblock.geometry",
        "wire": "cutblock.wire",
        "packing": "cutblock.packing",
    },
)
