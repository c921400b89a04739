"""Which reference belongs to which job: the values that its `expect` entries must state."""

from __future__ import annotations

from collections.abc import Callable

from . import atoms, electrons, molecules

REFERENCES: dict[str, Callable[[], dict[str, float]]] = {
    "first_light": electrons.first_light,
    "beam/drift_tube": electrons.drift_tube,
    "beam/streak": electrons.streak,
    "beam/storage_ring": electrons.ring,
    "beam/ion_kick": electrons.kick,
    "stack/thick_second": electrons.thick_second,
    "stack/one_monolayer": electrons.one_monolayer,
    "stack/clear_well": electrons.clear_well,
    "stack/graded_step": electrons.graded,
    "oxide/gate": electrons.gate,
    "molecules/hcl_stretch": molecules.hcl,
    "molecules/ammonia": molecules.ammonia,
    "molecules/hydrogen_transfer": molecules.hydrogen,
    "molecules/deuterium_transfer": molecules.deuterium,
    "molecules/transfer_scan": molecules.hydrogen,
    "neutrons/mirror": atoms.mirror,
    "neutrons/nickel_foil": atoms.foil,
    "atoms/transport": atoms.transport,
    "atoms/knock": atoms.knock,
    "atoms/pump_hum": atoms.hum,
    "atoms/floor": atoms.floor,
    "atoms/squeeze": atoms.squeeze,
    "atoms/paddle": atoms.paddle,
    "atoms/clear_sheet": atoms.clear_sheet,
    "atoms/grating": atoms.grating,
    "atoms/tilted_lattice": atoms.tilted_lattice,
    "ions/paul_trap": atoms.paul_trap,
}
