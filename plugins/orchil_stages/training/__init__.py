"""How the trained numbers of the excitation model and of the calibration are made; see DEVELOPERS.md."""
