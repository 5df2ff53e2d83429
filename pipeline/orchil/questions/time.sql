-- Where did the time go? Stages by the seconds of a core they took.
SELECT stage, n AS runs, n - ok AS failed_runs, total_cpu_seconds, mean_cpu_seconds, longest_seconds FROM timing
