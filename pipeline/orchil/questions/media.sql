-- How does the colour move between media? Every two rows of one name in different media.
SELECT a.candidate, a.medium AS one, b.medium AS other, a.absorption_max_nm AS one_nm, b.absorption_max_nm AS other_nm,
    b.absorption_max_nm - a.absorption_max_nm AS shift_nm
FROM ranking a JOIN ranking b ON a.candidate = b.candidate AND a.row_number < b.row_number
WHERE a.absorption_max_nm IS NOT NULL AND b.absorption_max_nm IS NOT NULL
