"""Items, stores and the catalogue that holds them.  Standard library only."""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True)
class Item:
    """One item (SKU).

    content: volume or weight per unit, in ``content_unit`` (0: unknown).
    space_cm: shelf space per facing set as listed (width x facings), cm; 0: unknown.
    vat_rate: 0.20 means 20 %.  cost: unit cost ex VAT in money, None: unknown.
    price: only for offers: the intended consumer price.
    attributes: any further columns, text = category, float = number.
    is_offer: never sold here; may be listed by a plan.
    offered_to: clusters an offer is open to; empty: all.
    """

    code: str
    description: str = ""
    segment: str = ""
    brand: str = ""
    supplier: str = ""
    own_label: bool = False
    content: float = 0.0
    content_unit: str = ""
    space_cm: float = 0.0
    vat_rate: float = 0.0
    cost: float | None = None
    price: float | None = None
    keep: bool = False
    is_offer: bool = False
    offered_to: tuple[str, ...] = ()
    attributes: tuple[tuple[str, str | float], ...] = ()


@dataclass(frozen=True)
class Store:
    """One store.  space_cm: shelf space for the category, None: unknown."""

    code: str
    cluster: str = ""
    space_cm: float | None = None
    region: str = ""
    size: str = ""


@dataclass(frozen=True)
class Catalogue:
    """Items (J), stores (S), segments (G) and clusters (C), each in a fixed order.

    Every array in the program uses these orders: item axis J, store axis S,
    segment axis G, cluster axis C.  Items that are offers stand last.
    """

    category: str
    items: tuple[Item, ...]
    stores: tuple[Store, ...]
    segments: tuple[str, ...] = field(init=False)
    clusters: tuple[str, ...] = field(init=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "segments", tuple(sorted({i.segment for i in self.items})))
        object.__setattr__(self, "clusters", tuple(sorted({s.cluster for s in self.stores})))

    def segment_of_item(self) -> list[int]:
        """Segment index of every item, length J."""
        position = {name: g for g, name in enumerate(self.segments)}
        return [position[item.segment] for item in self.items]

    def cluster_of_store(self) -> list[int]:
        """Cluster index of every store, length S."""
        position = {name: c for c, name in enumerate(self.clusters)}
        return [position[store.cluster] for store in self.stores]

    def item_index(self) -> dict[str, int]:
        """Item code -> position on the item axis."""
        return {item.code: j for j, item in enumerate(self.items)}

    def store_index(self) -> dict[str, int]:
        """Store code -> position on the store axis."""
        return {store.code: s for s, store in enumerate(self.stores)}
