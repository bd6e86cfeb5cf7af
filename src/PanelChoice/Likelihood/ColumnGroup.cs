using PanelChoice.Design;

namespace PanelChoice.Likelihood;

/// <summary>Stored columns of one alternative that are held alike and worked in one loop: 1 to <see cref="Most"/>.</summary>
/// <param name="Coding">How they are held.</param>
/// <param name="Places">The stored columns.</param>
/// <param name="Parameters">The parameter of each.</param>
internal sealed record ColumnGroup(ColumnCoding Coding, int[] Places, int[] Parameters)
{
    /// <summary>Most columns in a group: with more, the sums of a gradient's loop would not all stay in registers.</summary>
    public const int Most = 6;

    /// <summary>The groups of some columns, given as stored column and parameter.</summary>
    public static ColumnGroup[] Of(BlockFormat format, int[] places, int[] parameters) =>
    [
        .. Enumerable.Range(0, places.Length)
            .GroupBy(i => format.Columns[places[i]].Coding)
            .SelectMany(alike => alike.Chunk(Most).Select(part => new ColumnGroup(alike.Key, [.. part.Select(i => places[i])], [.. part.Select(i => parameters[i])]))),
    ];

    /// <summary>Runs a loop made for the group's coding and number of columns.</summary>
    public void Run<TLoop>(ref TLoop loop)
        where TLoop : struct, IColumnLoop
    {
        switch (Coding)
        {
            case ColumnCoding.Whole16:
                Run<TLoop, HeldAsWhole16>(ref loop);
                break;
            case ColumnCoding.Whole32:
                Run<TLoop, HeldAsWhole32>(ref loop);
                break;
            default:
                Run<TLoop, HeldAsIs>(ref loop);
                break;
        }
    }

    private void Run<TLoop, THeld>(ref TLoop loop)
        where TLoop : struct, IColumnLoop
        where THeld : struct, IHeldAs
    {
        switch (Places.Length)
        {
            case 1:
                loop.Run<THeld, One>(this);
                break;
            case 2:
                loop.Run<THeld, Two>(this);
                break;
            case 3:
                loop.Run<THeld, Three>(this);
                break;
            case 4:
                loop.Run<THeld, Four>(this);
                break;
            case 5:
                loop.Run<THeld, Five>(this);
                break;
            default:
                loop.Run<THeld, Six>(this);
                break;
        }
    }

    private readonly struct One : IColumnCount
    {
        public static int Value => 1;
    }

    private readonly struct Two : IColumnCount
    {
        public static int Value => 2;
    }

    private readonly struct Three : IColumnCount
    {
        public static int Value => 3;
    }

    private readonly struct Four : IColumnCount
    {
        public static int Value => 4;
    }

    private readonly struct Five : IColumnCount
    {
        public static int Value => 5;
    }

    private readonly struct Six : IColumnCount
    {
        public static int Value => 6;
    }
}

/// <summary>A loop over a strip's lanes and a group's columns, compiled for each coding and number of columns.</summary>
internal interface IColumnLoop
{
    /// <summary>Runs it.</summary>
    void Run<THeld, TCount>(ColumnGroup group)
        where THeld : struct, IHeldAs
        where TCount : struct, IColumnCount;
}

/// <summary>A number of columns, known when a loop is compiled.</summary>
internal interface IColumnCount
{
    /// <summary>The number, 1 to <see cref="ColumnGroup.Most"/>.</summary>
    static abstract int Value { get; }
}
