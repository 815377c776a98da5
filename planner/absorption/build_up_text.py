"""Layers in one cell of a table: the list of a TOML file, or a short line of words.

The short line names the layers from the front to the wall, with ``+`` between them. Each is a kind, its
thickness in mm and ``key=value`` pairs under the same keys as in a TOML file::

    perforated 6 hole_mm=5 open_area=0.08 + porous 50 flow_resistivity=10000 + air 50
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from typing import Any

from planner.errors import MaterialError

_EXAMPLE = "Write it like: porous 50 flow_resistivity=10000 + air 50"


def layers_from_text(text: str) -> list[dict[str, Any]]:
    """Layers as dictionaries, from the front to the wall; `build_up.build_up` checks what they say.

    Parameters
    ----------
    text
        A TOML list of tables (it begins with ``[``), or the short line.

    Raises
    ------
    MaterialError
        It is neither.

    Examples
    --------
    >>> layers_from_text("porous 50 flow_resistivity=10000 + air 20 local=true")[1]
    {'layer': 'air', 'thickness_mm': 20, 'local': True}
    """
    if not text.strip():
        raise MaterialError("has no layers", cure=_EXAMPLE)
    if text.lstrip().startswith("["):
        return _from_toml(text)
    return [_layer(part, number) for number, part in enumerate(text.split("+"), 1)]


def text_of_layers(layers: Sequence[Mapping[str, Any]]) -> str:
    """The short line of some layers."""
    return " + ".join(_words(layer) for layer in layers)


def _from_toml(text: str) -> list[dict[str, Any]]:
    try:
        layers = tomllib.loads(f"build_up = {text.strip()}")["build_up"]
    except (tomllib.TOMLDecodeError, RecursionError, KeyError) as error:
        raise MaterialError(f"cannot be read: {error}", cure=_EXAMPLE) from error
    if not isinstance(layers, list) or not all(isinstance(layer, dict) for layer in layers):
        raise MaterialError("is no list of layers", cure=_EXAMPLE)
    return layers


def _layer(part: str, number: int) -> dict[str, Any]:
    where = f"layer {number}"
    words = part.split()
    if not words:
        raise MaterialError("has no name", where=where, cure=_EXAMPLE)
    if not words[0].isalpha():
        raise MaterialError(f"{words[0][:40]!r} is no list of layers", where=where, cure=_EXAMPLE)
    layer: dict[str, Any] = {"layer": words[0].lower()}
    for place, word in enumerate(words[1:]):
        key, sign, value = word.partition("=")
        if not sign and place == 0:
            key, value = "thickness_mm", word
        elif not sign and place == 1 and word == "mm" and "thickness_mm" in layer:
            continue
        elif not (key and value and sign):
            raise MaterialError(f"{word[:40]!r} is no key=value", where=where, cure=_EXAMPLE)
        if key in layer:
            raise MaterialError(f"{key!r} stands there twice", where=where, cure=_EXAMPLE)
        layer[key] = _value(value)
    return layer


def _value(word: str) -> float | int | bool | str:
    if word in ("true", "false"):
        return word == "true"
    for kind in (int, float):
        try:
            return kind(word)
        except ValueError:
            continue
    return word


def _words(layer: Mapping[str, Any]) -> str:
    words = [str(layer["layer"])]
    if "thickness_mm" in layer:
        words.append(_word(layer["thickness_mm"]))
    rest = (key for key in layer if key not in ("layer", "thickness_mm"))
    return " ".join([*words, *(f"{key}={_word(layer[key])}" for key in rest)])


def _word(value: Any) -> str:
    return str(value).lower() if isinstance(value, bool) else str(value)
