"""A packet as it stands in a job file: one kind with its parameters."""

from __future__ import annotations

from typing import Annotated

from ..models import Choice, Item
from .base import Packet
from .eigenstate import EigenstatePacket
from .file import FilePacket
from .gaussian import GaussianPacket, SumPacket

PACKETS: dict[str, type[Packet]] = {
    "gaussian": GaussianPacket,
    "sum": SumPacket,
    "eigenstate": EigenstatePacket,
    "file": FilePacket,
}
PacketItem = Annotated[Item, Choice(PACKETS, "packet")]
