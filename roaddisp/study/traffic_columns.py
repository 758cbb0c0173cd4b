"""Columns of roads, profiles, counts, mix and factors."""

from __future__ import annotations

from typing import Final

from roaddisp.study.table_types import CLASSES, DAY_TYPES, LAYER, Column, Table

ROADS: Final = Table(
    "roads",
    "road centrelines, one feature a link, in any CRS",
    LAYER,
    (
        Column("link", "id of the link, unique", "id", required=True),
        Column(
            "aadt",
            "vehicles a day, both directions of what the line stands for, seven-day annual average",
            "number",
            low=0,
            high=1_000_000,
            empty="only with hourly counts, which then stand instead",
        ),
        Column("speed", "mean speed of the traffic", "speed", required=True, low=0.1, high=70.0),
        Column(
            "heavy_share",
            "share of heavy vehicles (bus, rigid_truck, articulated_truck)",
            "fraction",
            low=0,
            high=1,
            empty="the mix decides",
        ),
        Column("name", "name of the road", "text", empty="the link's id"),
        Column(
            "width",
            "width of the travelled way",
            "length",
            low=0.05,
            high=200.0,
            empty="3.6 m a lane, or 7.2 m without lanes",
        ),
        Column(
            "lanes",
            "number of lanes, both directions of what the line stands for",
            "number",
            low=1,
            high=40,
            empty="not given",
        ),
        Column("profile", "name of a profile", "text", empty="the only profile there is"),
        Column("fleet", "name of a fleet of the mix", "text", empty="the only fleet there is"),
        Column("grade", "slope along the link", "fraction", empty="0", later=True),
        Column(
            "height",
            "of the road surface above its surroundings, negative in a cut",
            "length",
            empty="0",
            later=True,
        ),
        Column(
            "edge_slope",
            "slope of the sides of an embankment or a cut",
            "number",
            empty="0",
            later=True,
        ),
        Column("capacity", "vehicles an hour", "number", empty="none", later=True),
        Column(
            "barrier_height",
            "height of a barrier beside the road",
            "length",
            empty="none",
            later=True,
        ),
        Column(
            "barrier_offset",
            "distance of the barrier from the edge",
            "length",
            empty="none",
            later=True,
        ),
    ),
    "LineString or MultiLineString",
)

PROFILES: Final = Table(
    "profiles",
    "shares of the day's traffic by hour of the civil clock",
    "CSV",
    (
        Column("profile", "name of the profile", "id", required=True),
        Column(
            "day_type",
            "days it stands for; a named type comes before 'all'",
            "text",
            required=True,
            choices=("all", *DAY_TYPES),
        ),
        Column(
            "hour",
            "hour of the civil clock that begins then",
            "integer",
            required=True,
            low=0,
            high=23,
        ),
        Column(
            "share",
            "share of the day's vehicles in the hour; the 24 shares sum to 1 within "
            "0.001 and are taken as they stand",
            "fraction",
            required=True,
            low=0,
            high=1,
        ),
        Column(
            "month",
            "month it stands for; a named month comes before none",
            "integer",
            low=1,
            high=12,
            empty="every month",
        ),
        Column(
            "day_factor",
            "the day's total over AADT, the same in all hours of a day; its mean "
            "over the calendar year is 1 within 1 %",
            "number",
            low=0,
            high=20,
            empty="1",
        ),
    ),
)

COUNTS: Final = Table(
    "counts",
    "hourly counts, one row a link and hour (and class)",
    "CSV",
    (
        Column("link", "id of a link of the roads", "id", required=True),
        Column("time", "beginning of the hour (end, with hour_ending)", "time", required=True),
        Column(
            "vehicles",
            "vehicles in the hour",
            "number",
            required=True,
            low=0,
            high=100_000,
            empty="not counted: a missing hour",
        ),
        Column(
            "vehicle_class",
            "class of the vehicles, one that the factors have; a class that "
            "has no row on a link does not run there",
            "text",
            empty="all vehicles",
        ),
        Column(
            "speed",
            "mean speed in the hour, of all classes",
            "speed",
            low=0.1,
            high=70.0,
            empty="the link's speed",
        ),
    ),
)

MIX: Final = Table(
    "mix",
    "shares of vehicle classes in each fleet",
    "CSV",
    (
        Column("fleet", "name of the fleet", "id", required=True),
        Column(
            "vehicle_class",
            f"{', '.join(CLASSES)}, or one that the factors add",
            "id",
            required=True,
        ),
        Column(
            "share",
            "share of the vehicles; the shares of a fleet sum to 1 within 0.001 and "
            "are taken as they stand",
            "fraction",
            required=True,
            low=0,
            high=1,
        ),
    ),
)

FACTORS: Final = Table(
    "factors",
    "emission factors by vehicle class and speed",
    "CSV",
    (
        Column("vehicle_class", f"{', '.join(CLASSES)}, or one of your own", "id", required=True),
        Column(
            "speed", "mean speed the factor stands for", "speed", required=True, low=0, high=70.0
        ),
        Column(
            "nox", "NOx as NO2-equivalent mass", "emission factor", required=True, low=0, high=200.0
        ),
        Column(
            "no2_fraction",
            "share of NO2 in the NOx emitted",
            "fraction",
            required=True,
            low=0,
            high=1,
        ),
        Column(
            "year",
            "year of the fleet; the nearest to the study's is taken",
            "integer",
            low=1950,
            high=2100,
            empty="every year",
        ),
        Column(
            "group",
            "light or heavy, for a class of your own",
            "text",
            choices=("light", "heavy"),
            empty="as the class name says",
        ),
        Column("grade", "slope the factor stands for", "fraction", empty="0", later=True),
    ),
)
