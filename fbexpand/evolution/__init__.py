"""Series in time: laws of motion, sources, driven rims and steady states."""

from fbexpand.evolution.evolve import evolve as evolve
from fbexpand.evolution.laws import Diffusion as Diffusion
from fbexpand.evolution.laws import ModalLaw as ModalLaw
from fbexpand.evolution.laws import Paraxial as Paraxial
from fbexpand.evolution.laws import Wave as Wave
from fbexpand.evolution.record import Evolution as Evolution
from fbexpand.evolution.steady import solve_steady as solve_steady
