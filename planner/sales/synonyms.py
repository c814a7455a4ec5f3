"""The names real exports give to our columns.

Every column of ours has tiers of names, best first: a name of an earlier tier wins over
one of a later tier; two names of the same tier in one file are rivals, and the user is asked,
unless the column only describes (``DESCRIPTIVE``): then the name that stands first wins.
Names are compared without case, spaces, underscores and punctuation.
"""

from __future__ import annotations

Tiers = tuple[str, ...]

_ITEM: Tiers = (
    "item_code item_no item_number item_id item_nr sku sku_code sku_no sku_id product_code "
    "product_id product_no product_number prod_code prod_id article_no article_number article_code "
    "article_id art_no material material_no plu itemcd artikelnummer artikel_nr",
    "item",
    "product article prod artikel produkt",
    "ean ean13 ean_code gtin gtin13 gtin14 upc upc_code barcode",
)
_STORE: Tiers = (
    "store_no store_number store_id store_code store_nr store_num shop_no shop_id shop_code "
    "outlet_no outlet_id outlet_code branch_no branch_id branch_code site_no site_id site_code "
    "location_id location_code storecd filial_nr filialnummer",
    "store",
    "shop outlet branch site location filiale markt",
)
_DATE: Tiers = (
    "date day sales_date sale_date trading_date trading_day transaction_date trans_date "
    "business_date calendar_date trx_date datum",
)
_WEEK: Tiers = (
    "week_commencing week_start week_starting week_beginning week_start_date week_of wc "
    "wk_commencing wk_start week_from",
    "year_week yw iso_week iso_year_week week_id week_code",
    "week week_no week_number wk wk_no fiscal_week fin_week trading_week calendar_week "
    "kalenderwoche kw woche",
    "week_ending week_end week_end_date we wk_ending",
)
_YEAR: Tiers = ("year iso_year fiscal_year fin_year calendar_year yr jahr",)
_CATEGORY: Tiers = (
    "category category_name category_desc category_description",
    "cat cat_name product_category item_category merchandise_category kategorie warengruppe",
)
_COST: Tiers = (
    "unit_cost cost_price unit_cost_price purchase_price buying_price invoice_cost landed_cost "
    "cost_per_unit unit_cost_ex_vat cost_price_ex_vat einkaufspreis ek",
    "cost cost_ex_vat",
)
_PRICE: Tiers = (
    "price unit_price selling_price sell_price retail_price actual_price paid_price price_paid "
    "sales_price price_per_unit preis verkaufspreis",
    "avg_price average_price avg_selling_price",
)
_REGULAR: Tiers = (
    "regular_price reg_price base_price normal_price shelf_price standard_price full_price "
    "everyday_price non_promo_price undiscounted_price normalpreis",
    "list_price rrp recommended_price",
)
_SPACE: Tiers = (
    "space_cm shelf_cm shelf_space_cm category_space_cm linear_cm linear_space_cm bay_cm "
    "shelf_length_cm shelf_width_cm space shelf_space category_space linear_space",
    "space_mm shelf_mm linear_mm shelf_space_mm",
    "space_m shelf_m linear_m shelf_metres shelf_meters linear_metres linear_meters",
)

_ITEM_COLUMNS: dict[str, Tiers] = {
    "item": _ITEM,
    "gtin": ("gtin gtin13 gtin14 ean ean13 ean_code upc upc_code barcode",),
    "description": (
        "description item_description product_description item_desc product_desc item_name "
        "product_name article_name article_description sku_name sku_description sku_desc desc "
        "long_description bezeichnung",
        "name title text item product article",
    ),
    "segment": (
        "segment item_segment product_segment",
        "segment_name segment_desc need_state",
        "subcategory subcat subcategory_name subsegment",
        "product_group item_group group family product_family subgroup class subclass",
    ),
    "category": _CATEGORY,
    "brand": (
        "brand brand_name brand_desc brand_owner_name marke",
        "manufacturer_brand range_name",
    ),
    "supplier": (
        "supplier supplier_name vendor vendor_name lieferant",
        "supplier_code supplier_no supplier_id vendor_code vendor_no vendor_id",
        "manufacturer manufacturer_name producer maker",
    ),
    "own_label": (
        "own_label own_label_flag is_own_label own_brand own_brand_flag is_own_brand private_label "
        "private_label_flag is_private_label pl_flag ol_flag ownlabel_yn store_brand eigenmarke",
    ),
    "content": (
        "content net_content content_value pack_content contents inhalt",
        "net_weight volume volume_l volume_ml weight_g weight_kg content_ml content_l content_g "
        "content_kg size_ml size_g",
        "pack_size size weight",
    ),
    "content_unit": (
        "content_unit unit_of_content content_uom size_unit size_uom volume_unit weight_unit",
        "uom unit_of_measure pack_unit",
    ),
    "vat_rate": ("vat_rate vat vat_pct vat_percent vat_percentage tax_rate tax_pct mwst",),
    "cost": _COST,
    "net_cost": ("net_cost net_unit_cost net_net_cost cost_after_rebate dead_net_cost",),
    "rebate": ("rebate rebate_pct rebate_rate funding back_margin supplier_funding",),
    "margin_rate": ("margin_rate margin_pct margin_percent gross_margin_pct gm_pct",),
    "price": (
        "price retail_price selling_price unit_price planned_price proposed_price intended_price "
        "consumer_price target_price",
        "regular_price shelf_price base_price",
        "rrp list_price recommended_price",
    ),
    "space_cm": _SPACE,
    "width_cm": (
        "width_cm item_width_cm pack_width_cm product_width_cm unit_width_cm facing_width_cm",
        "width item_width pack_width product_width unit_width facing_width breite",
        "width_mm pack_width_mm item_width_mm",
    ),
    "facings": ("facings facing no_facings n_facings number_of_facings current_facings horizontal_facings",),
    "min_facings": ("min_facings minimum_facings facings_min min_facing",),
    "case_size": ("case_size case_qty units_per_case case_pack pack_qty outer_size",),
    "shelf_life": ("shelf_life shelf_life_days days_shelf_life life_days",),
    "keep": (
        "keep keep_flag must_keep must_stock locked protected",
        "core core_flag",
    ),
    "launch_date": (
        "launch_date launched listing_date first_listed introduced intro_date launch start_date",
    ),
}

_ON_SHELF: dict[str, Tiers] = {
    "days_on_sale": ("days_on_sale days_on_shelf days_available days_in_stock",),
    "days_out_of_stock": (
        "days_out_of_stock days_oos oos_days out_of_stock_days stockout_days days_stockout "
        "days_without_stock oos_day_count",
    ),
    "on_sale": (
        "on_sale on_sale_flag on_shelf on_shelf_flag is_on_shelf available availability available_flag",
        "listed listed_flag is_listed ranged ranged_flag in_range in_assortment",
        "instock_flag in_stock",
    ),
}

COLUMNS: dict[str, dict[str, Tiers]] = {
    "sales": {
        "store": _STORE,
        "date": _DATE,
        "week": _WEEK,
        "year": _YEAR,
        "item": _ITEM,
        "units": (
            "units unit qty quantity units_sold unit_sales sales_units sales_qty sales_quantity "
            "qty_sold quantity_sold sold_units sold_qty sold_quantity volume_units pieces pcs "
            "no_units menge absatz",
            "volume sales_volume weight_sold kg_sold",
        ),
        "revenue": (
            "revenue turnover sales_value sales_amount sales_amt sales value amount gross_sales "
            "gross_revenue sales_revenue sales_value_inc_vat sales_inc_vat revenue_inc_vat "
            "revenue_gross turnover_inc_vat retail_value value_sales sales_inc_tax till_value "
            "umsatz",
        ),
        "revenue_net": (
            "revenue_net net_revenue revenue_ex_vat revenue_excl_vat sales_ex_vat "
            "sales_value_ex_vat sales_excl_vat net_sales net_sales_value net_amount turnover_ex_vat "
            "turnover_net sales_net sales_ex_tax nettoumsatz",
        ),
        "price": _PRICE,
        "regular_price": _REGULAR,
        "promotion": (
            "promo_flag promotion_flag on_promo on_promotion is_promo is_promotion promoted "
            "promo_ind promotion_indicator promo_yn offer_flag on_offer",
            "promotion promo feature aktion",
        ),
        "display": (
            "display display_flag on_display is_display second_placement secondary_placement promo_display",
            "gondola_end end_cap",
        ),
        "cost": _COST,
        **_ON_SHELF,
        "category": _CATEGORY,
    },
    "items": _ITEM_COLUMNS,
    "offers": {
        **_ITEM_COLUMNS,
        "clusters": (
            "clusters offered_to offered_clusters offered_to_clusters clusters_offered open_to",
            "cluster store_cluster store_clusters",
        ),
        "earliest_week": (
            "earliest_week earliest first_week available_from from_week first_possible_week earliest_date",
            "available",
        ),
    },
    "stores": {
        "store": _STORE,
        "name": ("store_name shop_name outlet_name branch_name site_name location_name name",),
        "cluster": (
            "cluster store_cluster cluster_name",
            "cluster_id cluster_code",
            "store_group store_format format store_type banner",
        ),
        "space_cm": _SPACE,
        "region": ("region region_name area area_name district province county",),
        "size": ("size store_size size_band size_class sqm sales_area floor_space sales_area_sqm",),
    },
    "shoppers": {
        "store": _STORE,
        "date": _DATE,
        "week": _WEEK,
        "year": _YEAR,
        "shoppers": (
            "shoppers footfall customers customer_count customer_cnt visitors visits traffic "
            "shopper_count no_shoppers kunden",
            "baskets transactions tickets receipts",
        ),
        "category_baskets": ("category_baskets category_transactions category_shoppers",),
    },
    "costs": {
        "item": _ITEM,
        "cost": _COST,
        "from": (
            "from_week from from_date valid_from start_week start_date date_from effective_from "
            "effective_date effective_week valid_from_week since",
            *_WEEK,
            *_DATE,
        ),
    },
    "ranges": {
        "store": _STORE,
        "item": _ITEM,
        "first_week": (
            "first_week from_week start_week from_date start_date first_date listed_from range_from "
            "valid_from week_from date_from in_range_from",
            "from first listing_date listed_week",
        ),
        "last_week": (
            "last_week to_week end_week to_date end_date last_date listed_to listed_until range_to "
            "valid_to week_to date_to in_range_to until_week",
            "to last until delisting_date delisted_week",
        ),
    },
    "successors": {
        "old_item": (
            "old_item old_code old_sku old_item_code old_product old_article old old_item_no "
            "predecessor replaced_item from_item item_old sku_old old_ean discontinued_item",
        ),
        "new_item": (
            "new_item new_code new_sku new_item_code new_product new_article new new_item_no "
            "successor replacement replacement_item to_item item_new sku_new new_ean successor_item",
        ),
        "date": (
            "date week changeover changeover_date changeover_week from_week switch_date switch_week "
            "change_date change_week from_date effective_date date_of_change start_week",
        ),
        "pack_factor": (
            "pack_factor factor conversion conversion_factor unit_factor units_factor pack_ratio",
        ),
    },
}

# A wrong choice among these changes no figure, so rivals are no question.
DESCRIPTIVE = frozenset(
    (
        "description", "brand", "supplier", "gtin", "name", "region", "size", "launch_date", "case_size",
        "shelf_life", "earliest_week", "category_baskets", "content", "content_unit", "net_cost", "rebate",
    )
)  # fmt: skip

# Each group is needed; one of its columns is enough.
NEEDED: dict[str, tuple[tuple[str, ...], ...]] = {
    "sales": (
        ("store",),
        ("date", "week"),
        ("item",),
        ("units",),
        ("revenue", "revenue_net", "price", "regular_price"),
    ),
    "items": (("item",),),
    "offers": (("item",),),
    "stores": (("store",),),
    "shoppers": (("store",), ("date", "week"), ("shoppers",)),
    "costs": (("item",), ("cost",)),
    "ranges": (("store",), ("item",)),
    "successors": (("old_item",), ("new_item",)),
}

# Answers to questions about meaning travel the same road as column matches.
CHOICES: dict[str, str] = {
    "date_order": "dmy | mdy",
    "decimal_mark": ", | .",
    "first_monday": "YYYY-MM-DD",
}

# Column name endings that carry a unit: factor to centimetres.
CENTIMETRES: dict[str, float] = {"mm": 0.1, "m": 100.0, "metres": 100.0, "meters": 100.0}
CURRENCIES = frozenset(
    "eur euro euros gbp usd chf sek nok dkk pln czk huf ron cad aud nzd jpy".split()  # noqa: SIM905
)
