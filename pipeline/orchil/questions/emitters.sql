-- What emits where? Emission maxima in a window, the largest Stokes shift first.
-- :low_nm = 550; shorter end of the window in nm
-- :high_nm = 750; longer end of the window in nm
SELECT rank, candidate, absorption_max_nm, emission_max_nm,
    1e7 / absorption_max_nm - 1e7 / emission_max_nm AS stokes_shift_cm1
FROM ranking WHERE emission_max_nm BETWEEN :low_nm AND :high_nm ORDER BY stokes_shift_cm1 DESC
