"""The generic products shipped with the planner."""

from __future__ import annotations

from planner.absorption.library import builtin
from planner.treat import builtin_catalogue


def test_every_price_is_said_to_be_invented():
    """Nobody must mistake a made-up price for an offer."""
    for product in builtin_catalogue().values():
        assert product.price_per_pack is not None
        assert product.price_is_invented, product.id


def test_no_fire_class_is_claimed():
    """The planner has no certificate of anything."""
    assert all(not product.fire_class_declared for product in builtin_catalogue().values())


def test_it_can_treat_every_kind_of_surface_and_the_bass():
    """Walls, ceiling, floor, free-standing; several products above 0.6 at 125 Hz."""
    products = builtin_catalogue().values()
    places = {place for product in products for place in product.surfaces}
    assert places == {"wall", "ceiling", "floor", "free"}
    assert sum(product.coefficients.alpha[1] >= 0.6 for product in products) >= 5
    assert len(products) >= 20


def test_sizes_and_weights_are_those_of_things_one_can_carry():
    """Common practice, no source: a panel weighs 1 to 20 kg/m² and fits through a door."""
    for product in builtin_catalogue().values():
        assert product.depth_mm is not None, product.id
        assert product.weight_kg is not None
        if product.unit == "piece":
            assert min(product.width, product.height) <= 1.2
            assert 0.5 <= product.weight_kg / product.piece_area <= 30.0, product.id


def test_coefficients_are_those_of_the_material_named():
    """A spot check against the library's row."""
    row = builtin().find("wool-100-direct")
    product = builtin_catalogue().find("panel-wool-100")
    assert product.coefficients.alpha[1:7].tolist() == list(row.alpha[1:7])


def test_no_two_products_read_alike_on_a_list():
    words = [product.description for product in builtin_catalogue().values()]
    assert len(set(words)) == len(words)
