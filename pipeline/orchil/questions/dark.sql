-- Which have a dark state lowest, which often quenches emission?
-- :strength = 0.01; oscillator strength below which a state counts as dark
SELECT candidate, medium, wavelength_nm, oscillator_strength, overlap, pi_share
FROM states WHERE state = 1 AND oscillator_strength < :strength ORDER BY wavelength_nm DESC
