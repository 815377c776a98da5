"""What the room is: enters ``room.toml``, leaves a checked `Room`, its geometry and surfaces.

Lengths in a file may be metres, centimetres, feet or inches; inside they are metres.
"""

from planner.room.files import parse_room, read_room, room_to_toml, write_room
from planner.room.geometry import Frame, Geometry, geometry
from planner.room.model import Room
from planner.room.surfaces import Part, RoomSurfaces, room_library, room_surfaces

__all__ = [
    "Frame",
    "Geometry",
    "Part",
    "Room",
    "RoomSurfaces",
    "geometry",
    "parse_room",
    "read_room",
    "room_library",
    "room_surfaces",
    "room_to_toml",
    "write_room",
]
