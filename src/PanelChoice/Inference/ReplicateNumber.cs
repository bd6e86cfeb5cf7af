using MathNet.Numerics.Distributions;

namespace PanelChoice.Inference;

/// <summary>
/// How many replicates standard errors need (three-step rule of Andrews and Buchinsky 2000, Econometrica 68, quoted from memory): B replicates have a standard
/// error within a share d of that of infinitely many with probability 0.95 when B = z^2 w / d^2, z the normal quantile at 0.975 and w = (k - 1) / 4, k the replicates'
/// kurtosis. (1) B1 with k = 3; (2) k from these replicates, the largest over the parameters; (3) the larger of B1 and what that k asks for. All numbers are
/// rounded up.
/// </summary>
internal static class ReplicateNumber
{
    /// <summary>Probability with which the standard error is as near as the target says.</summary>
    public const double Coverage = 0.95;

    /// <summary>No more than these are made, whatever the kurtosis: a spread that needs more hangs on single draws.</summary>
    public const int Most = 9_999;

    /// <summary>Replicates of the first step.</summary>
    /// <param name="target">Relative distance wanted.</param>
    public static int First(double target) => Needed(target, 3);

    /// <summary>Replicates that a kurtosis asks for, at most <see cref="Most"/>.</summary>
    /// <param name="target">Relative distance wanted.</param>
    /// <param name="kurtosis">Fourth central moment over the squared second one.</param>
    public static int Needed(double target, double kurtosis) => (int)Math.Min(Most, Math.Ceiling(Exactly(target, kurtosis)));

    /// <summary>Whether the kurtosis asks for more than are made.</summary>
    public static bool IsOutOfReach(double target, double kurtosis) => Exactly(target, kurtosis) > Most;

    private static double Exactly(double target, double kurtosis)
    {
        var z = Normal.InvCDF(0, 1, 1 - ((1 - Coverage) / 2));
        return z * z * (kurtosis - 1) / 4 / (target * target);
    }
}
