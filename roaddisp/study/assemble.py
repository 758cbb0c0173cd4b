"""Scenarios put together: each table read once, each choice held against the others."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np

from roaddisp.constants import RELEASE_HEIGHT
from roaddisp.model import (
    Background,
    Counts,
    FactorTable,
    Fleet,
    Network,
    Profiles,
    Receptors,
    Scenario,
)
from roaddisp.study.air_table import constant_air, read_air
from roaddisp.study.choices import read_options
from roaddisp.study.columns import TableView
from roaddisp.study.fleet_tables import (
    check_fleet,
    no_mix,
    read_factors,
    read_mix,
    screening_factors,
)
from roaddisp.study.hours import TimeRules
from roaddisp.study.problems import nearest
from roaddisp.study.projection import check_distortion, given_crs, utm_crs
from roaddisp.study.receptor_files import (
    Gathered,
    add_grid,
    add_points,
    add_sites,
    caution_receptors,
    finish,
)
from roaddisp.study.roads import RoadLayer, check_roads, make_network, road_centroid
from roaddisp.study.scenarios import Settings
from roaddisp.study.sources import BUILT_IN, Sources
from roaddisp.study.times import find_zone
from roaddisp.study.traffic_tables import (
    check_day_factors,
    counted_links,
    read_counts,
    read_profiles,
)
from roaddisp.study.weather_table import Weather, read_weather


class Assembly:
    """Puts the scenarios of a study together.

    Attributes
    ----------
    crs : pyproj CRS
        Of the study, once `scenarios` has run; None where there is none.
    """

    def __init__(self, sources: Sources, settings: Sequence[Settings]) -> None:
        self.sources = sources
        self.settings = settings
        self.problems = sources.problems
        self.crs: Any = None
        self._networks: dict[str, Network | None] = {}

    def scenarios(self) -> list[Scenario]:
        """Read everything; scenarios that cannot be made are left out (and have problems)."""
        self.crs = self._study_crs()
        for each in self.settings:
            self._networks[each.name] = self._network(each)
        made = [self._scenario(each) for each in self.settings]
        for each in self.settings:
            for section in ("traffic", "fleet", "receptors"):
                self.sources.check_unused(each, section)
        return [scenario for scenario in made if scenario is not None]

    def _scenario(self, settings: Settings) -> Scenario | None:
        network = self._networks[settings.name]
        factors, fleet = self._factors(settings), self._fleet(settings)
        profiles, weather = self._profiles(settings), self._weather(settings)
        profile_view = self.sources.view(settings, "traffic", "profiles")
        if profiles is not None and profile_view is not None and weather is not None:
            check_day_factors(profiles, profile_view, weather.clock)
        counts = self._counts(settings, network, factors, weather)
        view = self.sources.view(settings, "roads")
        if view and network and fleet and factors and (counts or not self._has_counts(settings)):
            check_fleet(view, network, fleet, factors, counts)
        background = self._background(settings, weather)
        receptors, gathered = self._receptors(settings, network)
        options = read_options(settings, factors, weather, receptors, self.problems)
        if network is not None and receptors is not None and weather is not None:
            self._caution_places(settings, network, receptors, weather)
        if (
            self.problems.errors
            or network is None
            or fleet is None
            or factors is None
            or weather is None
            or background is None
            or receptors is None
            or options is None
        ):
            return None
        return Scenario(
            settings.name,
            options,
            weather.clock,
            network,
            profiles,
            counts,
            fleet,
            factors,
            weather.at(*road_centroid(network, self.crs)),
            background,
            receptors,
            gathered.sites,
            self.sources.files(settings),
            settings.written,
        )

    # --- roads and their CRS ------------------------------------------------------

    def _road_layer(self, settings: Settings) -> RoadLayer | None:
        view = self.sources.view(settings, "roads")
        if view is None:
            return None
        return self.sources.once(
            ("roads", settings.signature("roads")), lambda: check_roads(view, self.problems)
        )

    def _study_crs(self) -> Any:
        layers = [self._road_layer(each) for each in self.settings]
        places = [layer.degrees() for layer in layers if layer is not None]
        section = self.settings[0].section("study")
        asked = section.crs if section is not None else None
        about = {"file": self.settings[0].file, "place": self.settings[0].place("study", "crs")}
        crs = None
        if asked is not None:
            crs = given_crs(asked, self.problems, **about)
        degrees = np.concatenate(places) if places else np.empty((0, 2))
        if not len(degrees):
            return crs
        longitude, latitude = 0.5 * (degrees.min(axis=0) + degrees.max(axis=0))
        if asked is None:
            if not -80.0 <= latitude <= 84.0:
                self.problems.error(
                    "the roads lie beyond the UTM zones",
                    **about,
                    value=f"latitude {latitude:.2f}",
                    allowed="study.crs, a projected CRS",
                    mend="name a projected CRS in metres by study.crs",
                )
                return None
            crs = utm_crs(longitude, latitude)
        if crs is not None:
            check_distortion(crs, longitude, latitude, self.problems, **about)
        return crs

    def _network(self, settings: Settings) -> Network | None:
        layer = self._road_layer(settings)
        if layer is None or self.crs is None:
            return None
        profiles, fleet = self._profiles(settings), self._fleet(settings)
        counts = self.sources.view(settings, "traffic", "counts")
        mixed = self.sources.view(settings, "fleet", "mix") is not None
        names = profiles.names if profiles is not None else None
        section = settings.section("fleet")
        fleets: tuple[str, ...] | None = None
        if section is not None and section.mix is None:
            fleets = ()
        elif mixed and fleet is not None:
            fleets = fleet.names
        if self._has_counts(settings) and counts is None:
            return None
        counted = counted_links(counts) if counts is not None else frozenset()
        return self.sources.once(
            ("network", settings.signature("roads", "traffic", "fleet")),
            lambda: make_network(
                layer,
                self.crs,
                profiles=names,
                fleets=fleets,
                counted=counted,
                counts_only=counts is not None and settings.section("traffic").profiles is None,
                problems=self.problems,
            ),
        )

    # --- traffic and fleet ----------------------------------------------------------

    @staticmethod
    def _has_counts(settings: Settings) -> bool:
        section = settings.section("traffic")
        return section is not None and section.counts is not None

    def _profiles(self, settings: Settings) -> Profiles | None:
        view = self.sources.view(settings, "traffic", "profiles")
        if view is None:
            return None
        return self.sources.once(
            ("profiles", settings.signature("traffic")), lambda: read_profiles(view)
        )

    def _factors(self, settings: Settings) -> FactorTable | None:
        section = settings.section("fleet")
        if section is None:
            return None
        key = ("factors", settings.signature("fleet"))
        if section.factors == BUILT_IN:
            place = settings.place("fleet", "factors")
            return self.sources.once(
                key, lambda: screening_factors(self.problems, file=settings.file, place=place)
            )
        view = self.sources.view(settings, "fleet", "factors")
        if view is None:
            return None
        return self.sources.once(key, lambda: read_factors(view, section.year))

    def _fleet(self, settings: Settings) -> Fleet | None:
        section = settings.section("fleet")
        if section is None:
            return None
        if section.mix is None:
            return no_mix()
        view = self.sources.view(settings, "fleet", "mix")
        if view is None:
            return None
        factors = self._factors(settings)
        return self.sources.once(
            ("mix", settings.signature("fleet")), lambda: read_mix(view, factors)
        )

    def _counts(
        self,
        settings: Settings,
        network: Network | None,
        factors: FactorTable | None,
        weather: Weather | None,
    ) -> Counts | None:
        view = self.sources.view(settings, "traffic", "counts")
        zone = self._zone(settings)
        if view is None or zone is None:
            return None
        section, layer = settings.section("traffic"), self._road_layer(settings)
        rules = TimeRules(section.clock, section.hour_ending, zone)
        links = tuple(layer.columns["link"]) if layer is not None else None
        return self.sources.once(
            ("counts", settings.signature("study", "traffic", "fleet", "weather", "roads")),
            lambda: read_counts(
                view,
                rules,
                weather.clock if weather else None,
                weather.offset if weather else None,
                links=links,
                link_speed=network.speed if network is not None else None,
                known_classes=factors.classes if factors is not None else None,
            ),
        )

    # --- weather and air ------------------------------------------------------------

    def _zone(self, settings: Settings) -> ZoneInfo | None:
        section = settings.section("study")
        if section is None:
            return None
        zone = find_zone(section.timezone)
        if zone is None:
            from zoneinfo import available_timezones

            near = nearest(section.timezone, sorted(available_timezones()))
            self.problems.error(
                "study.timezone: no time zone has this name",
                file=settings.file,
                place=settings.place("study", "timezone"),
                value=section.timezone,
                allowed='an IANA name, as "America/Denver"',
                mend=f"did you mean {near!r}?" if near else "name the zone of the nearest city",
            )
        return zone

    def _weather(self, settings: Settings) -> Weather | None:
        view, zone = self.sources.view(settings, "weather"), self._zone(settings)
        if view is None or zone is None:
            return None
        section = settings.section("weather")
        rules = TimeRules(section.clock, section.hour_ending, zone)
        return self.sources.once(
            ("weather", settings.signature("study", "weather")), lambda: read_weather(view, rules)
        )

    def _background(self, settings: Settings, weather: Weather | None) -> Background | None:
        section, study = settings.section("air"), settings.section("study")
        zone = self._zone(settings)
        if section is None or study is None or zone is None:
            return None
        reference = section.reference or study.reference
        key = ("air", settings.signature("study", "weather", "air"))
        if section.constant is not None:
            if weather is None:
                return None
            return self.sources.once(
                key,
                lambda: constant_air(
                    section.constant,
                    weather.clock,
                    reference,
                    self.problems,
                    file=settings.file,
                    place=lambda gas: settings.place("air", "constant", gas),
                ),
            )
        view = self.sources.view(settings, "air")
        if view is None:
            return None
        rules = TimeRules(section.clock, section.hour_ending, zone)
        clock, offset = (weather.clock, weather.offset) if weather else (None, None)
        return self.sources.once(key, lambda: read_air(view, rules, clock, offset, reference))

    # --- receptors --------------------------------------------------------------------

    def _receptors(
        self, settings: Settings, network: Network | None
    ) -> tuple[Receptors | None, Gathered]:
        section = settings.section("receptors")
        if section is None:
            return None, Gathered()
        gathered = self.sources.once(
            ("receptors", settings.signature("receptors")), lambda: self._gather(settings)
        )
        whole = not any(each is None for each in self._networks.values())
        if network is None or not gathered.sound or (section.grid is not None and not whole):
            return None, gathered
        place = settings.place("receptors")
        receptors = self.sources.once(
            ("flagged", settings.signature("receptors", "roads", "traffic", "fleet")),
            lambda: finish(
                gathered, network, self.crs, self.problems, file=settings.file, place=place
            ),
        )
        return receptors, gathered

    def _gather(self, settings: Settings) -> Gathered:
        section, gathered = settings.section("receptors"), Gathered()
        crs = self.crs or utm_crs(3.0, 0.0)
        points = self.sources.view(settings, "receptors", "points")
        sites = self.sources.view(settings, "receptors", "sites")
        asked = (section.points is not None) + (section.sites is not None)
        gathered.sound = asked == (points is not None) + (sites is not None)
        if points is not None:
            add_points(gathered, points, crs, section.height)
        if sites is not None:
            add_sites(
                gathered,
                sites,
                crs,
                section.height,
                outline=section.outline_spacing,
                inside=section.inside_spacing,
            )
        networks = [each for each in self._networks.values() if each is not None]
        if section.grid is not None and len(networks) == len(self.settings):
            add_grid(
                gathered,
                networks,
                section.grid,
                section.height,
                self.problems,
                file=settings.file,
                place=settings.place("receptors", "grid"),
            )
        if self.crs is None:
            gathered.sound = False
        return gathered

    def _caution_places(
        self, settings: Settings, network: Network, receptors: Receptors, weather: Weather
    ) -> None:
        place = f"{settings.place('receptors')}, scenario {settings.name}"
        about = {"file": settings.file, "place": place}
        lid = float(np.min(weather.hours["mixing_height"]))
        caution_receptors(receptors, network, lid, self.problems, **about)
        if lid < max(RELEASE_HEIGHT.values()):
            view: TableView | None = self.sources.view(settings, "weather")
            if view is not None:
                view.caution(
                    "a lid below the height at which traffic releases its plume: roads give "
                    "nothing in such hours",
                    "mixing_height",
                    value=f"lowest {lid:g} m",
                    mend="look whether mixing heights are in the right unit",
                )
