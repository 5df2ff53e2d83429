"""Light and matter in formulas: pure functions of numbers and arrays, no chemistry and no state.

``units``            constants and conversions
``strength``         dipole, oscillator strength, absorptivity, emission rate
``layers``           what a layer takes out of a light
``polarised``        crystals, stretched films, photoselection
``transfer``         energy transfer between two dyes
``solvatochromism``  shift of bands with the polarity of the medium

All functions take scalars or arrays and broadcast. Units are in the names of the arguments.
"""
