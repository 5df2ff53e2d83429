-- Where would a measurement tell most? The widest intervals among the best.
-- :best = 100; how far down the ranking
SELECT rank, candidate, absorption_low_nm, absorption_max_nm, absorption_high_nm,
    absorption_high_nm - absorption_low_nm AS width_nm, trust
FROM ranking WHERE rank <= :best ORDER BY width_nm DESC LIMIT 10
