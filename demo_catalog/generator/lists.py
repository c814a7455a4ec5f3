"""The invented range as plain lists: segments, brands, suppliers, items, offers, stores.

Everything here is a fact the chain's data team would know.  What shoppers think
of the items is drawn in ``tastes``.
"""

from __future__ import annotations

from dataclasses import dataclass

CATEGORY = "Tea & Infusions"
CHAIN = "Fennholt"

SEGMENTS = (
    "Black tea",
    "Green & white tea",
    "Herbal singles",
    "Wellness blends",
    "Fruit infusions",
    "Rooibos",
    "Chai & latte powders",
)
BLACK, GREEN, HERBAL, WELLNESS, FRUIT, ROOIBOS, CHAI = range(7)

FLAVOURS = (
    "classic",
    "bergamot",
    "citrus",
    "mint",
    "spice",
    "vanilla & caramel",
    "berry",
    "orchard",
    "floral",
    "green leaf",
    "garden herb",
    "evening herb",
    "bush",
    "milky",
)


@dataclass(frozen=True)
class Brand:
    """level: price level against the segment's; promotion_gap: mean weeks between its promotions."""

    name: str
    supplier: str
    own_label: bool
    level: float
    promotion_gap: int


BRANDS = (
    Brand("Fennholt Daily", "Marrowby Packers", True, 0.66, 24),
    Brand("Fennholt Select", "Marrowby Packers", True, 0.98, 18),
    Brand("Pellwick", "Pellwick Houses Ltd", False, 1.05, 9),
    Brand("Harrowmede", "Pellwick Houses Ltd", False, 1.38, 12),
    Brand("Tavelune", "Lumengarth Herbals", False, 1.08, 9),
    Brand("Blathwen", "Lumengarth Herbals", False, 1.26, 11),
    Brand("Okavira", "Orvessane Foods", False, 1.02, 8),
    Brand("Zefirelle", "Orvessane Foods", False, 1.12, 11),
    Brand("Saffreya", "Kestrowan Imports", False, 1.40, 13),
    Brand("Dunvarra", "Kestrowan Imports", False, 1.18, 11),
    Brand("Murrando", "Kestrowan Imports", False, 1.10, 12),
    Brand("Quellthorp", "Marrowby Packers", False, 0.78, 14),
    Brand("Ilmevar", "Ilmevar Growers", False, 1.12, 16),
)


@dataclass(frozen=True)
class ItemFacts:
    """One item as the chain knows it.

    flavour: position in FLAVOURS.  bags: servings in the pack.  grams: net content.
    strength 0..1: mild to strong.  launch: 0 on the shelf from the start, 1 or 2: comes at
    that review, 3: an offer, never sold.  like: for an offer, the item it copies, else "".
    """

    code: str
    name: str
    segment: int
    brand: int
    flavour: int
    bags: int
    grams: float
    pack: str
    strength: float
    caffeine: bool
    organic: bool
    launch: int = 0
    like: str = ""


_GRAMS = (2.0, 1.75, 1.75, 2.0, 2.5, 1.75, 12.5)
_OWN_CODES = 400

# name, segment, brand, flavour, bags, strength, marks (c caffeine, o organic, t tin, l loose), launch
_ROWS: tuple[tuple[str, int, str, str, int, float, str, int], ...] = (
    ("Breakfast Tea", BLACK, "Fennholt Daily", "classic", 80, 0.70, "c", 0),
    ("Breakfast Tea", BLACK, "Fennholt Daily", "classic", 40, 0.70, "c", 0),
    ("Strong Morning", BLACK, "Pellwick", "classic", 80, 0.95, "c", 0),
    ("House Blend", BLACK, "Pellwick", "classic", 40, 0.75, "c", 0),
    ("House Blend", BLACK, "Pellwick", "classic", 20, 0.75, "c", 0),
    ("Bergamot Black", BLACK, "Pellwick", "bergamot", 20, 0.60, "c", 0),
    ("Lemon Black", BLACK, "Pellwick", "citrus", 20, 0.50, "c", 0),
    ("Decaf House Blend", BLACK, "Pellwick", "classic", 40, 0.65, "", 0),
    ("Highland Leaf", BLACK, "Harrowmede", "classic", 20, 0.60, "c", 0),
    ("Fine Bergamot", BLACK, "Harrowmede", "bergamot", 20, 0.65, "c", 0),
    ("Highland Leaf Loose", BLACK, "Harrowmede", "classic", 50, 0.60, "clt", 0),
    ("Vanilla Black", BLACK, "Harrowmede", "vanilla & caramel", 20, 0.50, "c", 1),
    ("Budget Black", BLACK, "Quellthorp", "classic", 80, 0.80, "c", 0),
    ("Organic Highland", BLACK, "Fennholt Select", "classic", 20, 0.65, "co", 2),
    ("Green Tea", GREEN, "Fennholt Daily", "green leaf", 20, 0.45, "c", 0),
    ("Green Tea Lemon", GREEN, "Fennholt Daily", "citrus", 20, 0.40, "c", 0),
    ("Green Leaf", GREEN, "Dunvarra", "green leaf", 20, 0.55, "c", 0),
    ("Green Leaf", GREEN, "Dunvarra", "green leaf", 40, 0.55, "c", 0),
    ("Green Jasmine", GREEN, "Dunvarra", "floral", 20, 0.45, "c", 0),
    ("Green Garden Mint", GREEN, "Dunvarra", "mint", 20, 0.50, "c", 0),
    ("White Peach", GREEN, "Dunvarra", "orchard", 20, 0.25, "c", 1),
    ("Green & Ginger", GREEN, "Saffreya", "spice", 18, 0.60, "co", 0),
    ("Green Lemon", GREEN, "Pellwick", "citrus", 20, 0.45, "c", 0),
    ("Organic Green", GREEN, "Fennholt Select", "green leaf", 20, 0.55, "co", 0),
    ("Peppermint", HERBAL, "Fennholt Daily", "mint", 40, 0.60, "", 0),
    ("Camomile", HERBAL, "Fennholt Daily", "floral", 25, 0.35, "", 0),
    ("Fennel", HERBAL, "Fennholt Daily", "garden herb", 25, 0.40, "", 0),
    ("Peppermint", HERBAL, "Tavelune", "mint", 20, 0.70, "", 0),
    ("Peppermint", HERBAL, "Tavelune", "mint", 40, 0.70, "", 0),
    ("Camomile", HERBAL, "Tavelune", "floral", 20, 0.40, "", 0),
    ("Fennel Anise", HERBAL, "Tavelune", "garden herb", 20, 0.50, "", 0),
    ("Nettle", HERBAL, "Tavelune", "garden herb", 20, 0.55, "", 0),
    ("Lemon Balm", HERBAL, "Ilmevar", "citrus", 15, 0.35, "o", 0),
    ("Mountain Sage", HERBAL, "Ilmevar", "garden herb", 15, 0.65, "o", 0),
    ("Garden Mint", HERBAL, "Ilmevar", "mint", 15, 0.65, "o", 1),
    ("Peppermint Value", HERBAL, "Quellthorp", "mint", 50, 0.55, "", 0),
    ("Organic Camomile", HERBAL, "Fennholt Select", "floral", 20, 0.40, "o", 2),
    ("Evening Blend", WELLNESS, "Blathwen", "evening herb", 20, 0.40, "", 0),
    ("After Dinner", WELLNESS, "Blathwen", "garden herb", 20, 0.50, "", 0),
    ("Winter Ginger", WELLNESS, "Blathwen", "spice", 20, 0.75, "", 0),
    ("Lime Blossom & Elder", WELLNESS, "Blathwen", "floral", 20, 0.35, "", 0),
    ("Quiet Hour", WELLNESS, "Tavelune", "evening herb", 20, 0.35, "", 0),
    ("Ginger Lemon", WELLNESS, "Tavelune", "spice", 20, 0.70, "", 0),
    ("Turmeric & Pepper", WELLNESS, "Saffreya", "spice", 18, 0.80, "o", 0),
    ("Cardamom Balance", WELLNESS, "Saffreya", "spice", 18, 0.60, "o", 0),
    ("Still Night", WELLNESS, "Saffreya", "evening herb", 18, 0.40, "o", 1),
    ("Evening Herbs", WELLNESS, "Fennholt Daily", "evening herb", 25, 0.40, "", 0),
    ("Mint & Lemongrass", WELLNESS, "Blathwen", "mint", 20, 0.50, "", 2),
    ("Red Berries", FRUIT, "Fennholt Daily", "berry", 25, 0.55, "", 0),
    ("Apple & Cinnamon", FRUIT, "Fennholt Daily", "orchard", 25, 0.50, "", 0),
    ("Forest Fruit", FRUIT, "Okavira", "berry", 20, 0.65, "", 0),
    ("Forest Fruit", FRUIT, "Okavira", "berry", 40, 0.65, "", 0),
    ("Citrus Grove", FRUIT, "Okavira", "citrus", 20, 0.55, "", 0),
    ("Peach & Mango", FRUIT, "Okavira", "orchard", 20, 0.50, "", 0),
    ("Strawberry Vanilla", FRUIT, "Okavira", "vanilla & caramel", 20, 0.55, "", 2),
    ("Rosehip & Hibiscus", FRUIT, "Tavelune", "berry", 20, 0.70, "", 0),
    ("Apple Orchard", FRUIT, "Pellwick", "orchard", 20, 0.50, "", 0),
    ("Wild Cherry", FRUIT, "Pellwick", "berry", 20, 0.60, "", 0),
    ("Fruit Garden", FRUIT, "Quellthorp", "berry", 50, 0.50, "", 0),
    ("Rooibos", ROOIBOS, "Fennholt Daily", "bush", 40, 0.50, "", 0),
    ("Rooibos Vanilla", ROOIBOS, "Fennholt Daily", "vanilla & caramel", 20, 0.45, "", 0),
    ("Cape Bush", ROOIBOS, "Murrando", "bush", 20, 0.55, "", 0),
    ("Cape Bush", ROOIBOS, "Murrando", "bush", 40, 0.55, "", 0),
    ("Bush Caramel", ROOIBOS, "Murrando", "vanilla & caramel", 20, 0.50, "", 0),
    ("Bush Orange", ROOIBOS, "Murrando", "citrus", 20, 0.50, "", 1),
    ("Rooibos Spice", ROOIBOS, "Saffreya", "spice", 18, 0.65, "o", 0),
    ("Chai Latte", CHAI, "Zefirelle", "spice", 20, 0.60, "c", 0),
    ("Vanilla Latte", CHAI, "Zefirelle", "vanilla & caramel", 20, 0.45, "c", 0),
    ("Matcha Latte", CHAI, "Zefirelle", "green leaf", 12, 0.50, "c", 0),
    ("Golden Turmeric Latte", CHAI, "Zefirelle", "milky", 12, 0.60, "", 0),
    ("Chai Latte", CHAI, "Fennholt Daily", "spice", 20, 0.55, "c", 0),
    ("Rooibos Latte", CHAI, "Murrando", "milky", 12, 0.50, "", 2),
)

# Offers: as above, with the item each one copies ("brand|name|bags") or "" where it fills a gap.
_OFFERS: tuple[tuple[str, int, str, str, int, float, str, str], ...] = (
    ("Strong Morning Extra", BLACK, "Quellthorp", "classic", 80, 0.92, "c", "Pellwick|Strong Morning|80"),
    ("Bergamot Decaf", BLACK, "Harrowmede", "bergamot", 20, 0.55, "", ""),
    ("Peppermint Family Pack", HERBAL, "Tavelune", "mint", 80, 0.70, "", ""),
    ("Forest Berries", FRUIT, "Pellwick", "berry", 20, 0.64, "", "Okavira|Forest Fruit|20"),
    ("Ginger & Orange", FRUIT, "Okavira", "spice", 20, 0.65, "", ""),
    ("Chai Latte Light", CHAI, "Zefirelle", "spice", 20, 0.50, "c", "Zefirelle|Chai Latte|20"),
)

# The old code of a pack that was resized: (brand|name|bags now, bags before).
SUCCESSION = ("Blathwen|Evening Blend|20", 25)
KEPT = ("Pellwick|House Blend|40", "Fennholt Daily|Peppermint|40")


def brand_index() -> dict[str, int]:
    """Brand name -> position."""
    return {brand.name: k for k, brand in enumerate(BRANDS)}


def key_of(item: ItemFacts) -> str:
    """ "brand|name|bags": how the lists above point at an item."""
    return f"{BRANDS[item.brand].name}|{item.name}|{item.bags}"


def _fact(row: tuple[str, int, str, str, int, float, str], number: int, launch: int, like: str) -> ItemFacts:
    name, segment, brand_name, flavour, bags, strength, marks = row
    brand = brand_index()[brand_name]
    prefix = "00" if BRANDS[brand].own_label else f"{31 + brand}"
    pack = (
        "tin"
        if "t" in marks
        else "jar"
        if segment == CHAI and bags == 20
        else "sachet box"
        if (segment == CHAI)
        else "box"
    )
    return ItemFacts(
        code=f"{prefix}{4117 + 37 * number:05d}",
        name=name,
        segment=segment,
        brand=brand,
        flavour=FLAVOURS.index(flavour),
        bags=bags,
        grams=_GRAMS[segment] * bags,
        pack=pack,
        strength=strength,
        caffeine="c" in marks,
        organic="o" in marks,
        launch=launch,
        like=like,
    )


def all_items() -> tuple[ItemFacts, ...]:
    """Every item ever sold (a resized pack under its new code), then the offers."""
    sold = [_fact(row[:7], k, row[7], "") for k, row in enumerate(_ROWS)]
    offers = [_fact(row[:7], len(_ROWS) + k, 3, row[7]) for k, row in enumerate(_OFFERS)]
    return tuple(sold + offers)


CLUSTERS = ("Coast", "Inland", "Metro")
SIZES = ("small", "medium", "large")
TOWNS = (
    "Alderbank", "Bexcombe", "Carrowby", "Dellmouth", "Eastrigg", "Farholm", "Gannerdale", "Hexley Quay",
    "Inchmoor", "Jarrowfield", "Kelmarrow", "Lanthorpe", "Morrowick", "Netherby Cross", "Orlestone",
    "Penhallow Green", "Quarnside", "Ravensholt", "Selmarrow Park", "Tarnwater", "Ullerby", "Vennmoor",
    "Wexbridge", "Yarrowdene", "Ashgarth", "Brindle Row", "Coldwharf Row", "Drayfield", "Elmstead Mill",
    "Fosseway", "Greywell", "Hollinside", "Ivelchester", "Juniper Hill", "Kingsmarle", "Loxham",
)  # fmt: skip
