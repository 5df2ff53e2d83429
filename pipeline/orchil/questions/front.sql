-- Which are not beaten on every want by another? The first Pareto front.
SELECT rank, candidate, score, hit_probability, absorption_max_nm, molar_absorptivity, long_axis_angle_deg
FROM ranking WHERE pareto_front = 1 ORDER BY rank
