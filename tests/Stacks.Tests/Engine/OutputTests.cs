using System.Collections.Concurrent;
using System.Text.Json.Nodes;
using Stacks.Abstractions;
using Stacks.Pipeline;
using Xunit;

namespace Stacks.Tests.Engine;

/// <summary>Partial names, final names, what is done, refused and replaced, failing disks.</summary>
public class OutputTests
{
    private static readonly FrameLayout Row = new() { Width = 3, Height = 1, SampleType = SampleType.UInt16 };
    private static readonly string[] All = ["in.mem", "out.mem", "out.mem.mask", "out.mem.prov.json"];

    private static Bench WithFrames()
    {
        Bench bench = new();
        bench.Source.Add<ushort>(Row, 1, 200, 3).Add<ushort>(Row, 4, 5, 6);
        return bench;
    }

    private static RunOutcome Outcome(RunPlan plan) => StackRun.Execute(plan, null, CancellationToken.None).Outcome;

    private static string Refusal(RunPlan plan)
    {
        OutputException fault = Assert.Throws<OutputException>(() => StackRun.Execute(plan, null, CancellationToken.None));
        Assert.Equal(73, fault.ExitCode);
        Assert.EndsWith("give --overwrite to replace it", fault.Message, StringComparison.Ordinal);
        return fault.Message;
    }

    [Fact]
    public void The_same_work_is_done_once()
    {
        using Bench bench = WithFrames();
        RunPlan plan = bench.Plan(FakeFilter.Cap(100, 7));
        Assert.Equal(RunOutcome.Made, Outcome(plan));
        DateTime stamp = File.GetLastWriteTimeUtc(bench.Output);
        RunResult again = StackRun.Execute(plan, null, CancellationToken.None);
        Assert.Equal(RunOutcome.AlreadyDone, again.Outcome);
        Assert.Null(again.Provenance);
        Assert.Equal(RunOutcome.AlreadyDone, Outcome(plan with { Overwrite = true, Workers = 1 }));
        Assert.Equal(stamp, File.GetLastWriteTimeUtc(bench.Output));
        Assert.Equal(All, bench.FilesThere);
    }

    [Fact]
    public void Other_work_is_refused_by_name_and_replaced_when_asked()
    {
        RunPlan Plan(Bench bench, string filterDigest, string formatDigest, string recipeDigest)
        {
            PlannedStep step = Bench.Step(FakeFilter.Cap(100, 7));
            return bench.Plan() with
            {
                Steps = [step with { Filter = step.Filter with { Origin = step.Filter.Origin with { Digest = filterDigest } } }],
                FormatOrigins = [new PluginOrigin("Memory", "1.0", "memory.dll", formatDigest)],
                RecipeDigest = recipeDigest,
            };
        }

        using Bench bench = WithFrames();
        Outcome(Plan(bench, "a", "b", "c"));
        Assert.Equal(RunOutcome.AlreadyDone, Outcome(Plan(bench, "a", "b", "c")));
        foreach (RunPlan other in new[] { Plan(bench, "x", "b", "c"), Plan(bench, "a", "x", "c"), Plan(bench, "a", "b", "x") })
            Assert.Contains(bench.Output + ": exists already and was made from another input, recipe or plugin", Refusal(other), StringComparison.Ordinal);
        bench.Source.Add<ushort>(Row, 9, 9, 9);
        Refusal(Plan(bench, "a", "b", "c"));
        Assert.Equal(RunOutcome.Made, Outcome(Plan(bench, "a", "b", "c") with { Overwrite = true }));
        Assert.Equal(3, bench.Format.Last!.Frames.Count);
        Assert.Equal(RunOutcome.AlreadyDone, Outcome(Plan(bench, "a", "b", "c")));
        Assert.Equal(All, bench.FilesThere);
    }

    [Theory]
    [InlineData(false)]
    [InlineData(true)]
    public void A_mask_that_the_new_output_does_not_have_goes_with_the_old_one_unless_it_was_changed(bool changed)
    {
        using Bench bench = WithFrames();
        Outcome(bench.Plan(FakeFilter.Cap(100, 7)));
        if (changed)
            File.AppendAllText(bench.Output + ".mask", "mine");
        Assert.Equal(RunOutcome.Made, Outcome(bench.Plan() with { WriteMask = false, Overwrite = true }));
        Assert.Equal(changed, File.Exists(bench.Output + ".mask"));
        Assert.True(File.Exists(bench.Output));
    }

    [Fact]
    public void A_changed_output_and_one_without_provenance_are_refused()
    {
        using Bench bench = WithFrames();
        RunPlan plan = bench.Plan();
        Outcome(plan);
        byte[] bytes = File.ReadAllBytes(bench.Output);
        bytes[0] ^= 1;
        File.WriteAllBytes(bench.Output, bytes);
        Assert.Contains("is not as its provenance says", Refusal(plan), StringComparison.Ordinal);
        File.WriteAllText(bench.Output + ".prov.json", "{ torn");
        Refusal(plan);
        File.Delete(bench.Output + ".prov.json");
        Assert.Contains("has no provenance beside it", Refusal(plan), StringComparison.Ordinal);
        Assert.Equal(bytes, File.ReadAllBytes(bench.Output));
        Assert.Equal(RunOutcome.Made, Outcome(plan with { Overwrite = true }));
    }

    [Theory]
    [InlineData("out.mem.partial")]
    [InlineData("out.mem.prov.json.partial")]
    [InlineData("out.mem.prov.json")]
    [InlineData("out.mem.mask")]
    public void What_is_left_of_another_run_is_refused_by_name_and_kept(string name)
    {
        using Bench bench = WithFrames();
        string left = Path.Combine(bench.Folder, name);
        File.WriteAllText(left, "left");
        Assert.StartsWith(left + ": ", Refusal(bench.Plan()), StringComparison.Ordinal);
        Assert.Equal("left", File.ReadAllText(left));
        Assert.Equal(["in.mem", name], bench.FilesThere);
        Assert.Equal(RunOutcome.Made, Outcome(bench.Plan() with { Overwrite = true }));
        Assert.Equal(All, bench.FilesThere);
    }

    [Fact]
    public void Every_file_is_synced_before_the_first_gets_its_final_name_and_the_stack_gets_it_last()
    {
        using Bench bench = WithFrames();
        ConcurrentQueue<string> calls = [];
        StackRun.Execute(
            bench.Plan(),
            null,
            path =>
            {
                calls.Enqueue(path == bench.Folder ? "folder" : Path.GetFileName(path));
                Assert.Equal(path == bench.Folder, File.Exists(bench.Output));
            },
            CancellationToken.None);
        Assert.Equal("folder", calls.Last());
        Assert.Equal(["folder", "out.mem.mask.partial", "out.mem.partial", "out.mem.prov.json.partial"], calls.Order(StringComparer.Ordinal));
    }

    [Theory]
    [InlineData(0)]
    [InlineData(2)]
    public void A_failing_disk_ends_the_run_without_final_names(int failAt)
    {
        using Bench bench = WithFrames();
        int calls = -1;
        StackIOException fault = Assert.Throws<StackIOException>(() => StackRun.Execute(
            bench.Plan(),
            null,
            path =>
            {
                if (Interlocked.Increment(ref calls) == failAt)
                    throw new StackIOException(path, "fsync failed: Input/output error (EIO)", "check the disk and run again");
            },
            CancellationToken.None));
        Assert.Equal(74, fault.ExitCode);
        Assert.Equal(["in.mem"], bench.FilesThere);
    }

    [Fact]
    public void The_systems_fsync_is_called_and_its_errors_are_seen()
    {
        // fsync(2) on a pipe or device that cannot sync gives EINVAL (POSIX.1-2017); a missing file gives ENOENT.
        if (OperatingSystem.IsWindows())
            return;
        StackIOException fault = Assert.Throws<StackIOException>(() => Durable.Sync("/dev/null"));
        Assert.Contains("Invalid argument", fault.Message, StringComparison.Ordinal);
        Assert.Throws<StackIOException>(() => Durable.Sync("/no such folder/x"));
        using Bench bench = WithFrames();
        Durable.Sync(bench.Folder);
        Durable.Sync(bench.Source.Path);
    }

    [Fact]
    public void The_sidecar_carries_the_digests()
    {
        using Bench bench = WithFrames();
        bench.Run(bench.Plan());
        JsonNode root = JsonNode.Parse(File.ReadAllText(bench.Output + ".prov.json"))!;
        Assert.Equal(Digests.OfFile(bench.Output, default), (string?)root["entity"]!["stacks:output"]!["stacks:sha256"]);
        Assert.Equal(Digests.OfFile(bench.Output + ".mask", default), (string?)root["entity"]!["stacks:companion1"]!["stacks:sha256"]);
        Assert.Equal(Digests.OfFile(bench.Source.Path, default), (string?)root["entity"]!["stacks:source"]!["stacks:sha256"]);
    }

    [Fact]
    public void SHA_256_is_that_of_the_standard()
    {
        // FIPS 180-4, example of one block: "abc".
        Assert.Equal("ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad", Digests.OfText("abc"));
        using TestSupport.TemporaryFolder folder = new();
        File.WriteAllText(folder.File("abc"), "abc");
        Assert.Equal(Digests.OfText("abc"), Digests.OfFile(folder.File("abc"), default));
        Assert.Throws<StackIOException>(() => Digests.OfFile(folder.File("none"), default));
    }
}
