namespace PanelChoice.Inference;

/// <summary>A series of numbered refits. A refit depends on the fit, the series and its number alone, wherever and whenever it is made.</summary>
public enum RefitSeries
{
    /// <summary>Bootstrap replicates, numbered from 0.</summary>
    Bootstrap,

    /// <summary>Refits without one cluster each, numbered by the cluster; nothing held besides what is fixed.</summary>
    Jackknife,
}
