-- Which are sure to lie in the window? The whole interval of the maximum between two wavelengths.
-- :low_nm = 490; shorter end of the window in nm
-- :high_nm = 580; longer end of the window in nm
SELECT rank, candidate, absorption_low_nm, absorption_max_nm, absorption_high_nm, trust
FROM ranking WHERE absorption_low_nm >= :low_nm AND absorption_high_nm <= :high_nm
ORDER BY rank
