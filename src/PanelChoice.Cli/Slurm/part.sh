#!/bin/bash
# A task of a Slurm job array: makes the part that has the task's number. submit.sh sends it; to send some parts again by hand:
#
#     sbatch --array=3,7 part.sh STUDY PARTS DIR
#
# A task that is requeued goes on where it stopped, one whose part is complete ends at once. PANELCHOICE names the program.
#SBATCH --job-name=panelchoice-part
#SBATCH --requeue
#SBATCH --open-mode=append
set -euo pipefail
study=$1 parts=$2 folder=$3
program=${PANELCHOICE:-panelchoice}
echo "part $SLURM_ARRAY_TASK_ID of $parts, job ${SLURM_ARRAY_JOB_ID}_$SLURM_ARRAY_TASK_ID on ${SLURMD_NODENAME:-this node}, restarts so far: ${SLURM_RESTART_COUNT:-0}"
case $program in *.dll) run=(dotnet "$program") ;; *) run=("$program") ;; esac
# In place of this shell, so that Slurm's signals reach the program.
exec "${run[@]}" bootstrap "$study" --part "$SLURM_ARRAY_TASK_ID/$parts" --out "$folder" --threads "${SLURM_CPUS_PER_TASK:-1}"
