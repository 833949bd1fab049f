"""What the window's process and a worker process say to each other: one JSON object a line, no Qt."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, ConfigDict, Field, TypeAdapter

from thalweg.study.events import AnyEvent, Failed


class Message(BaseModel):
    model_config = ConfigDict(frozen=True, defer_build=True)


class StartJob(Message):
    """`function` is a dotted name such as `thalweg_app.jobs:run`; it is called as function(payload, emit, should_stop)."""

    order: Literal["start"] = "start"
    job: int
    function: str
    payload: Any = None


class StopJob(Message):
    order: Literal["stop"] = "stop"
    job: int


class Ready(Message):
    """The process has loaded its libraries and waits for work."""

    say: Literal["ready"] = "ready"


class Compiling(Message):
    """The process compiles kernels, or has done with it."""

    say: Literal["compiling"] = "compiling"
    on: bool


class Events(Message):
    """Events of a job in their order, gathered so that at most about 30 lines a second are sent."""

    say: Literal["events"] = "events"
    job: int
    events: list[AnyEvent]


class Noticed(Message):
    """The job has seen that it shall stop and is gathering what it has."""

    say: Literal["noticed"] = "noticed"
    job: int


class Done(Message):
    say: Literal["done"] = "done"
    job: int
    value: Any = None


class JobFailed(Message):
    say: Literal["failed"] = "failed"
    job: int
    failure: Failed


class JobStopped(Message):
    """Stopped before there was anything to keep."""

    say: Literal["stopped"] = "stopped"
    job: int


Order = Annotated[StartJob | StopJob, Field(discriminator="order")]
Reply = Annotated[Ready | Compiling | Events | Noticed | Done | JobFailed | JobStopped, Field(discriminator="say")]
_LATER = ConfigDict(defer_build=True)
ORDERS: TypeAdapter[StartJob | StopJob] = TypeAdapter(Order, config=_LATER)
REPLIES: TypeAdapter[Ready | Compiling | Events | Noticed | Done | JobFailed | JobStopped] = TypeAdapter(Reply, config=_LATER)
