#!/bin/bash
#SBATCH --job-name=endgrain --requeue --open-mode=append
# One shard of a batch as a task of a job array. Usage:
#   J=$(sbatch --parsable --array=0-15 scripts/slurm/shard.sh OUT LIST [options of batch])
#   sbatch --dependency=afterany:$J --wrap 'endgrain merge OUT'
# A task that was interrupted, or whose program was killed, queues itself again: Slurm does so only for lost nodes. What is
# whole is not done again. `afterany`, not `afterok`: the merge tells what is missing. ENDGRAIN names the program.
into=$1 list=$2
shift 2
"${ENDGRAIN:-endgrain}" batch --quiet --die-with-parent --shard "$SLURM_ARRAY_TASK_ID/$SLURM_ARRAY_TASK_COUNT" \
    --files-from "$list" --into "$into" "$@"
code=$?
if ((code == 75 || code > 128)) && ((${SLURM_RESTART_COUNT:-0} < 20)); then
    echo "exit code $code: queued again"
    scontrol requeue "$SLURM_JOB_ID"
    sleep 60 # Slurm ends this task meanwhile
fi
exit "$code"
