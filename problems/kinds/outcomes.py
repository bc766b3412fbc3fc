"""The names, units and meanings of everything a plate or a stack of plates can give.

One list for the case file (what aims and limits may name), the evaluation and the printed table.
"""

from __future__ import annotations

from problems.problem import Outcome

_SHARED = (
    Outcome("heat", "W", "heat from surface to fluid (negative: from fluid to surface)"),
    Outcome("heat_flux", "W/m2", "heat over swept plate area"),
    Outcome("mean_h", "W/(m2 K)", "mean heat transfer coefficient"),
    Outcome("least_h", "W/(m2 K)", "least local heat transfer coefficient"),
    Outcome("evenness", "1", "least over mean local flux; under a flux mean over highest excess"),
    Outcome("drag", "N", "force of the flow on plates and wires: wall shear and wire drag"),
    Outcome("wire_drag", "N", "the part of the drag that the trip wires carry"),
    Outcome("fan_power", "W", "power that the fan or pump draws"),
    Outcome("heat_per_power", "1", "heat (absolute) over fan power"),
    Outcome("hottest_wall", "K", "highest surface temperature"),
    Outcome("coldest_wall", "K", "lowest surface temperature"),
    Outcome("film_temperature", "K", "temperature at which the properties are taken"),
    Outcome("plate_area", "m2", "swept area of all plates"),
    Outcome("plate_mass", "kg", "mass of the plates"),
    Outcome("onset", "m", "where transition begins; the length if the plate stays laminar"),
    Outcome("turbulent_share", "1", "share of the plate length that is turbulent"),
    Outcome("length_reynolds", "1", "Reynolds number on the plate length"),
    Outcome("wire_reynolds", "1", "velocity outside the layer times wire diameter over viscosity"),
    Outcome(
        "wire_margin", "1", "wire Reynolds number over 900 (grit: Re_k over 600); 0 without a wire"
    ),
)

_STACK = (
    Outcome("volume", "m3", "length times width times height of the plates and their gaps"),
    Outcome("outlet_temperature", "K", "mixed temperature of the fluid leaving the plates"),
    Outcome("mass_flow", "kg/s", "mass flow through the stack"),
    Outcome("flow_rate", "m3/s", "volume flow through the stack, at inlet density"),
    Outcome("system_pressure", "Pa", "pressure the fan makes up: stack, external, filter"),
    Outcome("specific_fan_power", "W/(m3/s)", "power that the fan draws over volume flow"),
    Outcome("pressure_drop", "Pa", "static pressure drop, from before the stack to behind it"),
    Outcome("entrance_drop", "Pa", "part of the pressure drop: contraction and entrance"),
    Outcome("shear_drop", "Pa", "part of the pressure drop: wall shear"),
    Outcome("development_drop", "Pa", "part of the pressure drop: the core speeds up"),
    Outcome("heating_drop", "Pa", "part of the pressure drop: the fluid expands as it heats"),
    Outcome("wire_drop", "Pa", "part of the pressure drop: trip wires"),
    Outcome("exit_drop", "Pa", "part of the pressure drop: exit (negative: pressure recovered)"),
    Outcome("gap_reynolds", "1", "Reynolds number on hydraulic diameter (twice the gap)"),
    Outcome(
        "approach", "delta K", "surface temperature at the outlet less outlet temperature, absolute"
    ),
)


# only where the case names a catalogue of fans, or what things cost
_FANS = (
    Outcome("fan_speed", "turn/s", "speed of the chosen fan"),
    Outcome("fan_count", "1", "number of chosen fans in parallel"),
    Outcome("fan_margin", "1", "share of the flow right of the peak of the fan's curve"),
    Outcome("fan_best_share", "1", "flow over that at the fan's best efficiency"),
)
_MONEY = (
    Outcome("yearly_energy", "kWh", "electricity of the fan in a year"),
    Outcome("yearly_cost", "money", "electricity and the annuity of plates and fans, in a year"),
    Outcome("present_value", "money", "plates and fans, and the electricity of the life today"),
)
OUTCOMES = {"plate": _SHARED + _MONEY, "stack": _SHARED + _STACK + _FANS + _MONEY}
OPTIONAL = {
    **{outcome.name: "fan.catalogue" for outcome in _FANS},
    **{outcome.name: "money" for outcome in _MONEY},
}

_PLATE_SETTINGS = (
    Outcome("length", "m", "plate length along the flow"),
    Outcome("velocity", "m/s", "free-stream velocity; for a stack the mean in the gap, at inlet"),
    Outcome("trip_position", "m", "wire from the leading edge; 0 without a wire"),
    Outcome("trip_height", "m", "wire diameter; 0 without a wire"),
    Outcome("trip_pitch", "m", "from one wire to the next; 0 with one wire or none"),
    Outcome("width", "m", "plate width across the flow"),
    Outcome("thickness", "m", "plate thickness"),
)

_STACK_SETTINGS = (
    Outcome("gap", "m", "clear gap between plates"),
    Outcome("height", "m", "height of the stack"),
    Outcome("count", "1", "number of plates, each with its gap; real while searching"),
)

SETTINGS = {"plate": _PLATE_SETTINGS, "stack": _PLATE_SETTINGS + _STACK_SETTINGS}
