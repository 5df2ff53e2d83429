-- What failed, and why? Failures by stage and reason, with an example.
SELECT failed_stage, reason_code, count(*) AS candidates, min(candidate) AS example, min(reason) AS says
FROM failures GROUP BY failed_stage, reason_code ORDER BY candidates DESC
