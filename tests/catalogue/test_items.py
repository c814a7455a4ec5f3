"""Orders of the catalogue's axes."""

from planner.catalogue.items import Catalogue, Item, Store


def test_axes_and_positions() -> None:
    items = (
        Item("2", segment="mint"),
        Item("1", segment="camomile"),
        Item("3", segment="mint", is_offer=True),
    )
    stores = (Store("B", "City"), Store("A", "Coast"), Store("C", "City"))
    catalogue = Catalogue("Tea", items, stores)
    assert catalogue.segments == ("camomile", "mint")
    assert catalogue.clusters == ("City", "Coast")
    assert catalogue.segment_of_item() == [1, 0, 1]
    assert catalogue.cluster_of_store() == [0, 1, 0]
    assert catalogue.item_index() == {"2": 0, "1": 1, "3": 2}
    assert catalogue.store_index() == {"B": 0, "A": 1, "C": 2}
